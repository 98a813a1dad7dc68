// The homing cycle of one axis: seek the switch fast, pull off, find it again slowly, pull off. Everything is
// laid into the timeline in advance; the switch ends a search wherever the shaft meets it.
//
//    seek ──────────────►│ switch
//                 ◄──────│ pull off
//                 ─ ─ ─ ►│ locate, slowly
//                 ◄ ─ ─ ─│ pull off: home
import type { Settings } from './settings.ts';
import { phasesOf } from './speed-profile.ts';
import type { Timeline } from './timeline.ts';

/** A search goes on for this many times the travel before it is given up. */
const searchTravels = 1.5;
/** The slow search may take this many pull-off lengths. */
const locatePullOffs = 5;

export interface HomingOutcome {
  endMs: number;
  /** 9: switch not found; 8: switch still closed after pulling off. */
  alarm: number | undefined;
}

export function homeAxis(
  timeline: Timeline,
  settings: Settings,
  axis: number,
  side: 1 | -1,
  startMs: number,
  isClosed: (shaft: number) => boolean,
): HomingOutcome {
  const seekSpeed = settings.value(25) / 60;
  const locateSpeed = settings.value(24) / 60;
  const pullOff = settings.value(27);
  const debounceMs = settings.value(26);
  const acceleration = settings.value(120 + axis);
  // The search counts from zero; an aborted one leaves a place that means nothing.
  const counter = [...timeline.placesAt(startMs).counter];
  counter[axis] = 0;
  timeline.settleCounter(startMs, counter);

  const move = (fromMs: number, length: number, direction: 1 | -1, speed: number): number => {
    const unit = counter.map((_, index) => (index === axis ? direction : 0));
    timeline.append(fromMs, unit, phasesOf(length, 0, speed, 0, acceleration));
    return Math.max(fromMs, timeline.endMs);
  };
  const search = (fromMs: number, length: number, speed: number): number | undefined => {
    if (isClosed(timeline.placesAt(fromMs).shaft[axis]!)) return fromMs;
    move(fromMs, length, side, speed);
    const metMs = timeline.firstWhen(fromMs, ({ shaft }) => isClosed(shaft[axis]!));
    if (metMs !== undefined) timeline.cut(metMs);
    return metMs;
  };

  let atMs = startMs;
  const searches: [length: number, search: number, pull: number][] = [
    [searchTravels * settings.value(130 + axis), seekSpeed, seekSpeed],
    [locatePullOffs * pullOff, locateSpeed, locateSpeed],
  ];
  for (const [length, searchSpeed, pullSpeed] of searches) {
    const metMs = search(atMs, length, searchSpeed);
    if (metMs === undefined) return { endMs: timeline.endMs, alarm: 9 };
    atMs = move(metMs + debounceMs, pullOff, side === 1 ? -1 : 1, pullSpeed) + debounceMs;
    if (isClosed(timeline.placesAt(atMs).shaft[axis]!)) return { endMs: atMs, alarm: 8 };
  }
  return { endMs: atMs, alarm: undefined };
}
