// Where a run left the axes, and whether the next one may believe the controller's count. An axis without a
// home switch has nothing but that count: if the controller was restarted or somebody turned the mast in
// between, travel and cable wrap would be measured from a false zero. Motion by hand in between is not seen.
import { DriverError } from '../../drivers/errors.ts';
import type { Position, Positioner } from '../../drivers/positioner/positioner.ts';
import type { Archive } from '../archive/archive.ts';

/** Kind of the archive's event that holds where the axes came to rest. */
export const restEvent = 'rest';

export interface AxisRest {
  run: number;
  position: Position;
  /** False when the run ended without knowing where the axes stand. */
  known: boolean;
}

/** Where the last run on this range left the axes; undefined when there was none. */
export async function lastRest(archive: Archive, range: string): Promise<AxisRest | undefined> {
  const last = (await archive.runs()).find((run) => run.range === range && run.samples > 0);
  if (!last) return undefined;
  const events = await archive.events(last.number);
  const rest = events.findLast((event) => event.kind === restEvent);
  if (rest) return { run: last.number, ...(rest.facts as { position: Position; known: boolean }) };
  // The process died: the last sample is all that is known, and a queued move may have followed it.
  const samples = await archive.samples(last.number);
  const position = samples.at(-1)?.track.at(-1)?.position ?? {};
  return { run: last.number, position, known: true };
}

/** Where the axes stand at the end of a run, as far as that can be told. */
export async function restNow(positioner: Positioner): Promise<{ position: Position; known: boolean }> {
  try {
    const position = await positioner.readPosition();
    return { position, known: positioner.referenceValid };
  } catch {
    // A controller that cannot be asked: the next run is not to believe it unasked.
    return { position: {}, known: false };
  }
}

/**
 * Throws POSITIONER_REFERENCE_LOST for an axis without a home switch that is not where it was left. A count
 * that the controller has kept since is true wherever it stands.
 */
export function checkUntouched(positioner: Positioner, rest: AxisRest, now: Position): void {
  if (rest.known && positioner.countUnbroken) return;
  for (const axis of positioner.axes) {
    if (axis.homing !== 'none') continue;
    const left = rest.position[axis.name];
    const counted = now[axis.name] ?? 0;
    const isThere = left !== undefined && Math.abs(counted - left) <= 2 * axis.toleranceDeg;
    if (rest.known && isThere) continue;
    const leftAt =
      rest.known && left !== undefined ? `at ${left.toFixed(2)}°` : 'without knowing where it stands';
    throw new DriverError(
      'POSITIONER_REFERENCE_LOST',
      `the controller counts ${axis.name} at ${counted.toFixed(2)}°, but run ${rest.run} left it ${leftAt}: ` +
        'it may have restarted, or somebody turned the axis',
      { axis: axis.name, countedDeg: counted, leftDeg: left ?? 'unknown', run: rest.run },
    );
  }
}
