import { describe, expect, it } from 'vitest';
import { parseLink } from '../../../../daemon/files/link-address.ts';

describe('link addresses', () => {
  it.each([
    ['tcp://127.0.0.1:5025', '127.0.0.1', 5025],
    ['tcp://analyzer.lab.example:1', 'analyzer.lab.example', 1],
    ['tcp://[fe80::1]:65535', 'fe80::1', 65_535],
    ['tcp://localhost:05025', 'localhost', 5025],
  ])('%s', (text, host, port) => {
    expect(parseLink(text)).toStrictEqual({ kind: 'link', link: { kind: 'tcp', host, port } });
  });

  it.each([
    ['serial:/dev/ttyUSB0', 'not yet offered'],
    ['tcp://127.0.0.1', 'port is missing'],
    ['tcp://[::1]', 'port is missing'],
    ['tcp://h:0', 'from 1 to 65535'],
    ['tcp://h:65536', 'from 1 to 65535'],
    ['tcp://h:', 'from 1 to 65535'],
    ['tcp://h:50 25', 'from 1 to 65535'],
    ['tcp://h:5025/x', 'from 1 to 65535'],
    ['tcp://::1:5025', 'brackets'],
    ['tcp://[::g]:5025', 'brackets hold'],
    ['tcp://300.1.1.1:5025', 'no name or address'],
    ['tcp://:5025', 'no name or address'],
    ['tcp://a b:5025', 'no name or address'],
    ['tcp://-a:5025', 'no name or address'],
    ['udp://h:5025', undefined],
    ['h:5025', undefined],
    ['', undefined],
  ])('%s is refused', (text, advice) => {
    const outcome = parseLink(text);
    expect(outcome.kind).toBe('refused');
    const given = outcome.kind === 'refused' ? outcome.advice : undefined;
    if (advice === undefined) expect(given).toBeUndefined();
    else expect(given).toContain(advice);
  });
});
