// Where a device is reached, as written in the range file: `tcp://host:port` or
// `serial:///dev/ttyACM0?baud=115200`. Opens nothing.
import { isIPv4, isIPv6 } from 'node:net';
import type { LinkAddress } from './range-file.ts';

export const linkExpectation = 'a link such as tcp://192.168.1.20:5025 or serial:///dev/ttyACM0?baud=115200';

const usualBaud = 115_200;
const baudRange = { least: 300, most: 4_000_000 };

export type ParsedLink = { kind: 'link'; link: LinkAddress } | { kind: 'refused'; advice?: string };

const hostName =
  /^(?=.{1,253}$)[A-Za-z0-9]([A-Za-z0-9-]*[A-Za-z0-9])?(\.[A-Za-z0-9]([A-Za-z0-9-]*[A-Za-z0-9])?)*\.?$/;

/** `tcp://host:port`, an IPv6 address in brackets; `serial://PATH`, `?baud=N` where it is not 115200. */
export function parseLink(text: string): ParsedLink {
  return /^serial:/i.test(text) ? parseSerial(text) : parseTcp(text);
}

/** Two links to one device: it could not tell whose question it answers. */
export function isSameDevice(a: LinkAddress, b: LinkAddress): boolean {
  if (a.kind === 'tcp') return b.kind === 'tcp' && a.host === b.host && a.port === b.port;
  return b.kind === 'serial' && a.path === b.path;
}

function parseSerial(text: string): ParsedLink {
  const match = /^serial:\/\/([^?#]*)(?:\?baud=([^&#]*))?$/.exec(text);
  if (!match) return refused('a serial link is serial:// and the device file, then ?baud=N where needed');
  const [, path = '', written] = match;
  if (!/^\/[\x21-\x7e]+$|^COM\d+$/.test(path))
    return refused('the device file is a full path such as /dev/ttyACM0');
  const baud = written === undefined ? usualBaud : Number(written);
  const isRate = /^\d{3,7}$/.test(written ?? '115200') && baud >= baudRange.least && baud <= baudRange.most;
  if (!isRate) return refused(`baud is a whole number from ${baudRange.least} to ${baudRange.most}`);
  return { kind: 'link', link: { kind: 'serial', path, baud } };
}

function parseTcp(text: string): ParsedLink {
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
