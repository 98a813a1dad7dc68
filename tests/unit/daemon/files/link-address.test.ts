import { describe, expect, it } from 'vitest';
import { isSameDevice, parseLink } from '../../../../daemon/files/link-address.ts';

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
    ['serial:///dev/ttyACM0', '/dev/ttyACM0', 115_200],
    ['serial:///dev/ttyUSB1?baud=9600', '/dev/ttyUSB1', 9600],
    ['serial:///dev/serial/by-id/usb-x_y-if00?baud=250000', '/dev/serial/by-id/usb-x_y-if00', 250_000],
    ['serial://COM7?baud=115200', 'COM7', 115_200],
  ])('%s', (text, path, baud) => {
    expect(parseLink(text)).toStrictEqual({ kind: 'link', link: { kind: 'serial', path, baud } });
  });

  it('tell two links to one device', () => {
    const linkOf = (text: string) => {
      const parsed = parseLink(text);
      if (parsed.kind !== 'link') throw new Error(text);
      return parsed.link;
    };
    const same = (a: string, b: string) => isSameDevice(linkOf(a), linkOf(b));
    expect(same('serial:///dev/ttyACM0?baud=9600', 'serial:///dev/ttyACM0')).toBe(true);
    expect(same('serial:///dev/ttyACM0', 'serial:///dev/ttyACM1')).toBe(false);
    expect(same('tcp://h:1', 'tcp://h:1')).toBe(true);
    expect(same('tcp://h:1', 'tcp://h:2')).toBe(false);
    expect(same('tcp://h:1', 'serial:///dev/ttyACM0')).toBe(false);
  });

  it.each([
    ['serial:/dev/ttyUSB0', 'serial:// and the device file'],
    ['serial://dev/ttyUSB0', 'full path'],
    ['serial:///dev/tty USB0', 'full path'],
    ['serial://', 'full path'],
    ['serial:///dev/ttyACM0?baud=fast', 'from 300 to 4000000'],
    ['serial:///dev/ttyACM0?baud=', 'from 300 to 4000000'],
    ['serial:///dev/ttyACM0?baud=110', 'from 300 to 4000000'],
    ['serial:///dev/ttyACM0?parity=even', 'serial:// and the device file'],
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
