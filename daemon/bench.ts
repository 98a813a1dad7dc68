// Range file → the devices on the bench, ready to be identified. The only file that names a wire.
import type { Analyzer } from '../drivers/analyzer/analyzer.ts';
import { ScanTableAnalyzer } from '../drivers/analyzer/scan-table/scan-table-analyzer.ts';
import { ScpiAnalyzer } from '../drivers/analyzer/scpi-analyzer.ts';
import type { Clock } from '../drivers/clock.ts';
import type { Link } from '../drivers/link/link.ts';
import { SerialLink } from '../drivers/link/serial.ts';
import { TcpLink } from '../drivers/link/tcp.ts';
import { GcodePositioner } from '../drivers/positioner/gcode-positioner.ts';
import type { Positioner } from '../drivers/positioner/positioner.ts';
import { ReportPositioner } from '../drivers/positioner/report-positioner.ts';
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
    analyzer: makeAnalyzer(analyzer, clock, makeLink(analyzer.link, 'analyzer')),
    positioner: makePositioner(positioner, clock, makeLink(positioner.link, 'positioner')),
  };
}

function makeAnalyzer({ dialect, trace }: RangeFile['analyzer'], clock: Clock, link: Link): Analyzer {
  if ('base' in dialect) return new ScanTableAnalyzer(link, clock, { dialect });
  return new ScpiAnalyzer(link, clock, { dialect, traceFormat: trace.format, byteOrder: trace.byteOrder });
}

function makePositioner({ family, axes }: RangeFile['positioner'], clock: Clock, link: Link): Positioner {
  const Driver = family === 'position-report' ? ReportPositioner : GcodePositioner;
  return new Driver(link, clock, { axes });
}

export async function closeBench(bench: Bench): Promise<void> {
  await Promise.allSettled([bench.analyzer.close(), bench.positioner.close()]);
}
