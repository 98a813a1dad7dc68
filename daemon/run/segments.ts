// Opening a segment: a part of a run between interruptions, with its own clock epoch, homing and tie.
// Also the patience with a device that went away: sessions are opened anew until the device is back or
// the patience is over.
import type { AnalyzerIdentity, PreparedSweep, SweepSetup } from '../../drivers/analyzer/analyzer.ts';
import type { Clock } from '../../drivers/clock.ts';
import { isDriverError } from '../../drivers/errors.ts';
import type { ControllerIdentity, Positioner } from '../../drivers/positioner/positioner.ts';
import type { Archive } from '../archive/archive.ts';
import type { Device, RunEvent } from './events.ts';
import { from } from './measure-position.ts';
import { patienceMs, reactionTo } from './retry-table.ts';
import type { Bench } from './safe-stop.ts';

export interface Connected {
  analyzer: AnalyzerIdentity;
  controller: ControllerIdentity;
  sweep: PreparedSweep;
}

/** Who is there, and the sweep as the analyzer confirms it. Nothing moves. */
export async function connect(bench: Bench, sweep: SweepSetup, signal: AbortSignal): Promise<Connected> {
  const controller = await from('positioner', bench.positioner.identify(signal));
  const analyzer = await from('analyzer', bench.analyzer.identify(signal));
  const prepared = await from('analyzer', bench.analyzer.prepare(sweep, signal));
  return { analyzer, controller, sweep: prepared };
}

export interface SegmentTools {
  bench: Bench;
  archive: Archive;
  clock: Clock;
  tell: (event: RunEvent) => void;
}

/** Writes segment and setup, makes the axes' reference valid and switches the source on. */
export async function openSegment(
  { bench, archive, clock, tell }: SegmentTools,
  run: number,
  segment: number,
  reason: string,
  connected: Connected,
  signal: AbortSignal,
): Promise<void> {
  const calibration = await from('analyzer', bench.analyzer.calibrationState(signal));
  await clock.whileReal(
    archive.addSegment(run, {
      segment,
      reason,
      epochWallMs: clock.wallMs(),
      epochMonotonicMs: clock.monotonicMs(),
      analyzer: connected.analyzer,
      controller: connected.controller,
    }),
  );
  await clock.whileReal(archive.addSetup(run, { setup: segment, sweep: connected.sweep, calibration }));
  tell({ kind: 'segment', segment, reason });
  if (!bench.positioner.referenceValid) {
    await from('positioner', bench.positioner.home(signal));
    tell({ kind: 'homed', position: await from('positioner', bench.positioner.readPosition(signal)) });
  }
  await from('analyzer', bench.analyzer.source(true, signal));
}

/** Opens the device's session anew, again and again, until it answers or its patience is over. */
export async function waitForDevice(
  { bench, clock, tell }: SegmentTools,
  device: Device,
  signal: AbortSignal,
): Promise<void> {
  const givingUpMs = clock.monotonicMs() + patienceMs[device];
  for (let waitMs = 500; ; waitMs = Math.min(2 * waitMs, 20_000)) {
    try {
      if (device === 'analyzer') await bench.analyzer.recover(signal);
      else await meetAgain(bench.positioner, signal);
      tell({ kind: 'recovered', device, text: `the ${device} answers again` });
      return;
    } catch (error) {
      signal.throwIfAborted();
      const hopeless = !isDriverError(error) || reactionTo(error.code, device) === 'give-up';
      if (hopeless || clock.monotonicMs() + waitMs > givingUpMs) throw error;
      const { code, message: text, facts } = error;
      tell({ kind: 'retry', device, code, text, facts, attempt: 0, waitMs });
      await clock.sleep(waitMs, signal);
    }
  }
}

/** A move of ours may still be going on while we were away: it is stopped before anything is asked. */
async function meetAgain(positioner: Positioner, signal: AbortSignal): Promise<void> {
  await positioner.stop();
  await positioner.identify(signal);
}
