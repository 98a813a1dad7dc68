// Making the coordinates true: the controller's homing cycle where axes have switches, unlocking where they
// have none. An axis without a switch is believed at the controller's zero, but not after a restart moved that
// zero under it: then somebody has to set it by hand.
import { demandContinuity } from './axis-continuity.ts';
import { alarmError } from './gcode-failures.ts';
import { alarmMeaning } from './gcode-meanings.ts';
import { fallToZero, noteMemory, setModes } from './gcode-memory.ts';
import { askTwice, awaitRest, type GcodeParts, pollMs, readPlaced } from './gcode-parts.ts';
import { homingSeconds } from './gcode-settings.ts';

const bannerMs = 3_000;
/** A failed cycle is followed by a banner within some 25 ms, even where its alarm was lost on the wire. */
const afterHomingMs = 300;

export interface HomeOptions {
  believeZeroAfterRestart: boolean;
  /** Called right before the cycle begins to move. */
  onMotion: () => void;
}

export async function homeAxes(parts: GcodeParts, options: HomeOptions, signal: AbortSignal): Promise<void> {
  await leaveMuteAlarm(parts, signal);
  const before = await readPlaced(parts, signal);
  fallToZero(parts, before);
  const locked = before.report.state === 'Alarm';
  if (!locked) await awaitRest(parts, signal);
  if (parts.axes.some((axis) => axis.homing === 'switch')) {
    const withinMs = homingSeconds(parts.settings, parts.axes, parts.reference.letters) * 1000;
    await parts.sender.line('$H', { withinMs, signal, onSend: options.onMotion });
    await parts.clock.sleep(afterHomingMs, signal);
  } else if (locked) {
    await askTwice(parts, '$X', signal);
  }
  const after = await readPlaced(parts, signal);
  if (after.report.state === 'Alarm') throw alarmError(parts.reference.alarm, parts.link.name);
  await awaitRest(parts, signal);
  parts.reference.clearAlarm();
  // Setting the mark anew must not cover up that it was lost.
  await noteMemory(parts, signal);
  await setModes(parts, signal);
  const placed = await readPlaced(parts, signal);
  if (!options.believeZeroAfterRestart) demandContinuity(parts.axes, parts.reference, placed.position);
  parts.reference.trust(placed);
}

/** After some alarms nothing is answered until a soft reset. Nothing moves then. */
async function leaveMuteAlarm(parts: GcodeParts, signal: AbortSignal): Promise<void> {
  const { alarm } = parts.reference;
  if (alarm === undefined || alarmMeaning(alarm).wayOut !== 'reset') return;
  await parts.sender.reset(bannerMs, signal);
  await parts.clock.sleep(pollMs, signal);
}
