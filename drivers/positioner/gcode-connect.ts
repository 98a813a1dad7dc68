// Finding out who answers at the other end and whether it can be left alone for a night: listens for a boot,
// probes, refuses what moves or waits, reads identity and settings. Resets nothing that might be moving and
// unlocks nothing: that is for stop() and home().
import { DriverError, isDriverError } from '../errors.ts';
import { urgentBytes } from './gcode-events.ts';
import { findMark, noteMemory, setModes } from './gcode-memory.ts';
import { askTwice, type GcodeParts, lineWithinMs, pollMs, readPlaced } from './gcode-parts.ts';
import type { ControllerLine, StatusReport } from './gcode-reports.ts';
import { checkSettings, limitsFrom, missingSettings, settingsIn } from './gcode-settings.ts';
import type { ControllerIdentity } from './positioner.ts';

/** A bootloader may swallow everything for 2 s after the port was opened. */
const bannerWithinMs = 2_500;
const probeRounds = 4;
const probeWithinMs = 1_000;
const attempts = 3;
const bannerMs = 3_000;
const usualLetters = 'XYZABCUVW';

/** Opens the link where it is closed; see Positioner.identify. A restart on the way begins the procedure again. */
export async function connect(parts: GcodeParts, signal?: AbortSignal): Promise<ControllerIdentity> {
  for (let attempt = 1; ; attempt += 1) {
    const foreign: string[] = [];
    const listening = parts.sender.events$.subscribe((event) => {
      if (event.kind === 'stray' && event.line.kind === 'foreign') foreign.push(event.line.text);
    });
    try {
      if (!parts.link.isOpen) {
        await parts.link.open(signal);
        await listenForBoot(parts, signal);
      }
      const report = await probe(parts, foreign, signal);
      await demandRest(parts, report, signal);
      // Once for each process: later on the mark is our own, and is checked with every move.
      parts.countUnbroken ??= await findMark(parts, signal);
      const identity = await interrogate(parts, signal);
      parts.reference.connected();
      return identity;
    } catch (error) {
      if (!isDriverError(error, 'POSITIONER_RESTARTED') || attempt >= attempts) throw error;
      await parts.clock.sleep(pollMs, signal);
    } finally {
      listening.unsubscribe();
    }
  }
}

async function listenForBoot(parts: GcodeParts, signal?: AbortSignal): Promise<void> {
  const banner = await parts.sender.next(
    (event) => (event.kind === 'restart' ? event : undefined),
    bannerWithinMs,
    signal,
  );
  // Remarks and stored start-up lines follow the banner.
  if (banner) await parts.clock.sleep(pollMs, signal);
}

async function probe(
  parts: GcodeParts,
  foreign: readonly string[],
  signal?: AbortSignal,
): Promise<StatusReport> {
  for (let round = 0; round < probeRounds; round += 1) {
    const answer = await parts.sender.askReport(probeWithinMs, signal);
    if (answer) return answer.report;
    refuseForeign(parts, foreign);
    parts.sender.nudge();
    await parts.clock.sleep(pollMs, signal);
  }
  // The other family is silent until it is asked in its own words; ours merely refuses them.
  parts.sender.nudge('M115');
  await parts.clock.sleep(probeWithinMs, signal);
  refuseForeign(parts, foreign);
  throw new DriverError(
    'POSITIONER_NOT_ANSWERING',
    `${parts.link.name}: no status report (no controller, other line speed, or locked until a stop resets it)`,
    { link: parts.link.name, rounds: probeRounds },
  );
}

function refuseForeign(parts: GcodeParts, foreign: readonly string[]): void {
  const [line] = foreign;
  if (line === undefined) return;
  throw new DriverError(
    'POSITIONER_UNEXPECTED_CONTROLLER',
    `${parts.link.name} is a controller of the position-report family: ${line.slice(0, 60)}`,
    { answered: line.slice(0, 200) },
  );
}

/** A machine that moves or is held is somebody's: not ours to reset. Simulation and sleep end by a reset. */
async function demandRest(parts: GcodeParts, first: StatusReport, signal?: AbortSignal): Promise<void> {
  if (first.state === 'Check' || first.state === 'Sleep') {
    await parts.sender.reset(bannerMs, signal);
    await parts.clock.sleep(pollMs, signal);
  }
  const before = await parts.sender.report(signal);
  // A single Idle may have been said just before a move begins.
  await parts.clock.sleep(pollMs, signal);
  const { report } = await parts.sender.report(signal);
  const stands = placeText(report) === placeText(before.report);
  if ((report.state === 'Idle' || report.state === 'Alarm') && stands) return;
  throw new DriverError(
    'POSITIONER_BUSY_AT_CONNECT',
    stands
      ? `${parts.link.name} is in ${report.stateText}: it was moving or held before we came`
      : `${parts.link.name}: its position changed while we watched: something else moves it`,
    { state: report.stateText, position: placeText(report) },
  );
}

/** The place in the controller's own numbers: the letters of its axes are not known yet. */
function placeText(report: StatusReport): string {
  return (report.machine ?? report.work ?? []).join(' ');
}

async function interrogate(parts: GcodeParts, signal?: AbortSignal): Promise<ControllerIdentity> {
  const identity = await askTwice(parts, '$I', signal);
  const version = dataIn(identity, 'VER');
  if (version === undefined) {
    throw new DriverError('POSITIONER_UNEXPECTED_CONTROLLER', `${parts.link.name} tells no version`, {
      answered: identity.length,
    });
  }
  const axisLetters = dataIn(identity, 'AXS')?.split(':')[1] ?? usualLetters;
  parts.reference.learn(axisLetters, parts.reference.limits);
  // Once more with the true letters: an axis of the range that the controller does not have shows here.
  const placed = await readPlaced(parts, signal);
  const letters = axisLetters.slice(0, placed.machine.length);
  await readSettings(parts, letters, signal);
  parts.sender.urgent(urgentBytes.feedOverride100, urgentBytes.rapidOverride100);
  await noteMemory(parts, signal);
  if (placed.report.state === 'Idle') await setModes(parts, signal);
  return {
    family: 'realtime-status',
    firmware: version.replace(/:$/, ''),
    options: dataIn(identity, 'OPT') ?? '',
  };
}

async function readSettings(parts: GcodeParts, letters: string, signal?: AbortSignal): Promise<void> {
  const settings = new Map<number, string>();
  // Twice: a line of the long print-out may be damaged on the wire.
  for (let round = 0; round < 2; round += 1) {
    const lines = await askTwice(parts, '$$', signal, lineWithinMs * 2);
    for (const [number, value] of settingsIn(lines)) settings.set(number, value);
    if (missingSettings(settings, parts.axes, letters).length === 0) break;
  }
  const missing = missingSettings(settings, parts.axes, letters);
  if (missing.length > 0) {
    throw new DriverError(
      'POSITIONER_BAD_ANSWER',
      `${parts.link.name} did not print the settings ${missing.map((number) => `$${number}`).join(', ')}`,
      { missing: missing.map((number) => `$${number}`).join(' ') },
    );
  }
  checkSettings(settings, parts.axes, letters);
  parts.settings = settings;
  parts.reference.learn(letters, limitsFrom(settings, parts.axes, letters));
}

function dataIn(lines: readonly ControllerLine[], key: string): string | undefined {
  for (const line of lines) if (line.kind === 'data' && line.key === key) return line.value;
  return undefined;
}
