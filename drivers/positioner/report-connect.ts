// Finding out who answers and whether it can be left alone for a night: listens for a boot, agrees on line
// numbers, refuses what is still moving, reads identity and settings, sets the modes. Resets and stops nothing.
import { DriverError, isDriverError } from '../errors.ts';
import type { ControllerIdentity } from './positioner.ts';
import { haltedError } from './report-failures.ts';
import type { ReportLine } from './report-lines.ts';
import { type ReportParts, restingPlace, sayTwice, setModes } from './report-parts.ts';
import { checkReportSettings, reportLimits, settingsFrom } from './report-settings.ts';

/** A bootloader may swallow everything for 2 s after the port was opened. */
const listenMs = 2_500;
const pollMs = 100;
/** There is no mark for the end of the boot messages: a gap must do. */
const quietMs = 500;
const bootMs = 10_000;
/** A barrier at rest is answered at once; one that is not waits for a motion. */
const restWithinMs = 1_500;
const attempts = 3;

/** Opens the link where it is closed; see Positioner.identify. A restart on the way begins the procedure again. */
export async function connectReports(
  parts: ReportParts,
  onBusy: () => void,
  signal?: AbortSignal,
): Promise<ControllerIdentity> {
  const said = parts.sender.halted;
  for (let attempt = 1; ; attempt += 1) {
    try {
      // Opening the port resets many boards, and nothing else that we can do helps a halted one.
      if (parts.sender.halted !== undefined && parts.link.isOpen) await parts.link.close();
      await listen(parts, signal);
      await meet(parts, signal);
      await demandRest(parts, onBusy, signal);
      const identity = await interrogate(parts, signal);
      parts.reference.connected();
      return identity;
    } catch (error) {
      if (said !== undefined && isDriverError(error, 'POSITIONER_NOT_ANSWERING'))
        throw haltedError(said, parts.link.name);
      if (!isDriverError(error, 'POSITIONER_RESTARTED') || attempt >= attempts) throw error;
    }
  }
}

/** Opens where needed, and waits until boot messages have ended. */
async function listen(parts: ReportParts, signal?: AbortSignal): Promise<void> {
  const openedMs = parts.clock.monotonicMs();
  let heardMs = Number.NEGATIVE_INFINITY;
  let boots = parts.link.isOpen ? 1 : 0;
  const listening = parts.sender.events$.subscribe((event) => {
    if (event.kind === 'restart') boots += 1;
    const isPulse = event.kind === 'line' && (event.line.kind === 'wait' || event.line.kind === 'busy');
    if (!isPulse) heardMs = parts.clock.monotonicMs();
  });
  const wasHalted = parts.sender.halted;
  try {
    if (!parts.link.isOpen) await parts.link.open(signal);
    for (;;) {
      const nowMs = parts.clock.monotonicMs();
      const isQuiet = nowMs - heardMs >= quietMs;
      if (isQuiet && (boots > 0 || nowMs - openedMs >= listenMs)) break;
      if (nowMs - openedMs >= bootMs) break;
      await parts.clock.sleep(pollMs, signal);
    }
  } finally {
    listening.unsubscribe();
  }
  if (wasHalted !== undefined && parts.sender.halted !== undefined) parts.sender.forgetHalt();
}

/** Agrees on answers and line numbers. The other family is told by what it says to our probe. */
async function meet(parts: ReportParts, signal?: AbortSignal): Promise<void> {
  let foreign: string | undefined;
  const listening = parts.sender.events$.subscribe((event) => {
    if (event.kind === 'line' && event.line.kind === 'foreign') foreign ??= event.line.text;
  });
  try {
    await parts.sender.resync(signal, restWithinMs);
  } catch (error) {
    if (foreign !== undefined) {
      throw new DriverError(
        'POSITIONER_UNEXPECTED_CONTROLLER',
        `${parts.link.name} is a controller of the realtime-status family: ${foreign.slice(0, 60)}`,
        { answered: foreign.slice(0, 200) },
        error,
      );
    }
    throw error;
  } finally {
    listening.unsubscribe();
  }
}

/** A machine that moves is somebody's: not ours to stop. */
async function demandRest(parts: ReportParts, onBusy: () => void, signal?: AbortSignal): Promise<void> {
  try {
    await parts.sender.line('M400', { withinMs: restWithinMs, limitMs: restWithinMs, signal });
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_NOT_ANSWERING', 'POSITIONER_STALLED')) throw error;
    onBusy();
    throw new DriverError(
      'POSITIONER_BUSY_AT_CONNECT',
      `${parts.link.name} does not come to rest: it was moving before we came`,
      { waitedMs: restWithinMs },
      error,
    );
  }
}

async function interrogate(parts: ReportParts, signal?: AbortSignal): Promise<ControllerIdentity> {
  await setModes(parts, signal);
  const told = (await sayTwice(parts, 'M115', signal)).map(textOf);
  const identity = told.find((text) => text.includes('FIRMWARE_NAME:'));
  if (identity === undefined) {
    throw new DriverError('POSITIONER_UNEXPECTED_CONTROLLER', `${parts.link.name} tells no firmware`, {
      answered: told.join(' | ').slice(0, 200),
    });
  }
  parts.stopsAtOnce = told.includes('Cap:EMERGENCY_PARSER:1');
  const settings = settingsFrom([
    ...(await ifKnown(parts, 'M503', signal)),
    ...(await ifKnown(parts, 'M211', signal)),
  ]);
  checkReportSettings(settings, parts.axes);
  parts.limits = reportLimits(settings, parts.axes);
  parts.reference.steps = settings.steps;
  await restingPlace(parts, restWithinMs, signal);
  return {
    family: 'position-report',
    firmware: /FIRMWARE_NAME: ?(.*?)(?: +[A-Z_]+:|$)/.exec(identity)?.[1] ?? identity,
    options: told
      .filter((text) => /^Cap:.*:1$/.test(text))
      .map((text) => text.slice(4, -2))
      .join(' '),
  };
}

/** Builds may lack a report of their settings. */
async function ifKnown(
  parts: ReportParts,
  text: string,
  signal?: AbortSignal,
): Promise<readonly ReportLine[]> {
  try {
    return await sayTwice(parts, text, signal);
  } catch (error) {
    if (!isDriverError(error, 'POSITIONER_COMMAND_REFUSED')) throw error;
    return [];
  }
}

function textOf(line: ReportLine): string {
  return 'text' in line ? line.text : '';
}
