// Range file → the devices on the bench, ready to be identified. The only file that names a wire.
import { ScpiAnalyzer } from '../drivers/analyzer/scpi-analyzer.ts';
import { dialectNamed } from '../drivers/analyzer/scpi-dialects.ts';
import type { Clock } from '../drivers/clock.ts';
import type { Link } from '../drivers/link/link.ts';
import { SerialLink } from '../drivers/link/serial.ts';
import { TcpLink } from '../drivers/link/tcp.ts';
import { GcodePositioner } from '../drivers/positioner/gcode-positioner.ts';
import type { LinkAddress, RangeFile } from './files/range-file.ts';
import type { Bench } from './run/safe-stop.ts';

/** How an address becomes a link; tests and nights hand in their own. */
export type LinkMaker = (address: LinkAddress, device: 'analyzer' | 'positioner') => Link;

function realLinks(clock: Clock): LinkMaker {
  return (address) =>
    address.kind === 'tcp' ? TcpLink.to(address.host, address.port, clock) : new SerialLink(address, clock);
}

/** Opens nothing yet: the drivers open their links when asked to identify. */
export function makeBench(range: RangeFile, clock: Clock, makeLink: LinkMaker = realLinks(clock)): Bench {
  const { analyzer, positioner } = range;
  return {
    analyzer: new ScpiAnalyzer(makeLink(analyzer.link, 'analyzer'), clock, {
      dialect: dialectNamed(analyzer.dialect),
      traceFormat: analyzer.trace.format,
      byteOrder: analyzer.trace.byteOrder,
    }),
    positioner: new GcodePositioner(makeLink(positioner.link, 'positioner'), clock, {
      axes: positioner.axes,
    }),
  };
}

export async function closeBench(bench: Bench): Promise<void> {
  await Promise.allSettled([bench.analyzer.close(), bench.positioner.close()]);
}
