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

/**
 * Who is there, and the sweep as the analyzer confirms it. Nothing is set in motion; `isReturn`: the one move
 * that a dead process of ours may have left is let end, or else is stopped.
 */
export async function connect(
  bench: Bench,
  clock: Clock,
  sweep: SweepSetup,
  isReturn: boolean,
  signal: AbortSignal,
): Promise<Connected> {
  const met = isReturn ? meetAfterDeath(bench.positioner, clock, signal) : bench.positioner.identify(signal);
  const controller = await from('positioner', met);
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

/** Longer than a turn takes that the dead process may have begun. */
const lastMoveMs = 30_000;

/**
 * A stop would reset the controller, and with it the proof that its count went on unbroken: one queued move is
 * let end. What still moves after that is not it.
 */
async function meetAfterDeath(
  positioner: Positioner,
  clock: Clock,
  signal: AbortSignal,
): Promise<ControllerIdentity> {
  const givingUpMs = clock.monotonicMs() + lastMoveMs;
  for (;;) {
    try {
      return await positioner.identify(signal);
    } catch (error) {
      if (!isDriverError(error, 'POSITIONER_BUSY_AT_CONNECT')) throw error;
      if (clock.monotonicMs() > givingUpMs) return meetAgain(positioner, signal);
      await clock.sleep(500, signal);
    }
  }
}

/** A move of ours may still be going on while we were away: it is stopped before anything is asked. */
async function meetAgain(positioner: Positioner, signal: AbortSignal): Promise<ControllerIdentity> {
  await positioner.stop();
  return positioner.identify(signal);
}
