// Where a device is reached, as written in the range file: `tcp://host:port`. Opens nothing.
import { isIPv4, isIPv6 } from 'node:net';
import type { LinkAddress } from './range-file.ts';

export const linkExpectation = 'a link such as tcp://192.168.1.20:5025';

export type ParsedLink = { kind: 'link'; link: LinkAddress } | { kind: 'refused'; advice?: string };

const hostName =
  /^(?=.{1,253}$)[A-Za-z0-9]([A-Za-z0-9-]*[A-Za-z0-9])?(\.[A-Za-z0-9]([A-Za-z0-9-]*[A-Za-z0-9])?)*\.?$/;

/** `tcp://host:port`; an IPv6 address stands in brackets. */
export function parseLink(text: string): ParsedLink {
  if (/^serial:/i.test(text)) {
    return refused('serial lines are not yet offered: reach the port through a TCP serial bridge');
  }
  const match = /^tcp:\/\/(?:\[([^\]]*)\]|([^:/[\]]*))(?::([^:]*))?$/.exec(text);
  if (!match) {
    const tooManyColons = /^tcp:\/\/[0-9A-Fa-f:]+$/.test(text);
    return refused(tooManyColons ? 'an IPv6 address stands in brackets: tcp://[::1]:5025' : undefined);
  }
  const [, bracketed, plain = '', port] = match;
  if (port === undefined) return refused('the port is missing');
  if (!/^\d{1,5}$/.test(port) || Number(port) < 1 || Number(port) > 65_535) {
    return refused('ports are whole numbers from 1 to 65535');
  }
  if (bracketed !== undefined) {
    if (!isIPv6(bracketed)) return refused('brackets hold an IPv6 address');
    return { kind: 'link', link: { kind: 'tcp', host: bracketed, port: Number(port) } };
  }
  const looksNumeric = /^[\d.]+$/.test(plain);
  if (looksNumeric ? !isIPv4(plain) : !hostName.test(plain)) return refused('the host is no name or address');
  return { kind: 'link', link: { kind: 'tcp', host: plain, port: Number(port) } };
}

function refused(advice: string | undefined): ParsedLink {
  return advice === undefined ? { kind: 'refused' } : { kind: 'refused', advice };
}
