// Everything that can be made to go wrong on the simulated bench, one entry each. Adding a fault is adding an
// entry; when it strikes is the injector's business. Sizes are drawn from the random stream handed in, so that
// a seed tells the whole story.
import type { SimulatedController } from '../positioner/simulated-controller.ts';
import type { RandomStream } from '../random.ts';
import type { InstrumentHooks } from './instrument-hooks.ts';

/** What a fault may lay hands on. */
export interface FaultTargets {
  controller: SimulatedController;
  hooks: InstrumentHooks;
  powerCycleInstrument: () => void;
  dropInstrumentVisitors: () => void;
  random: RandomStream;
  /** Calls `act` after so many milliseconds of the bench's clock. */
  later: (ms: number, act: () => void) => void;
}

export interface Fault {
  name: string;
  target: 'positioner' | 'analyzer';
  /** For the operator of the simulated bench. */
  does: string;
  inject: (at: FaultTargets) => void;
}

export const faults: readonly Fault[] = [
  {
    name: 'positioner-link-drop',
    target: 'positioner',
    does: 'closes the link; what is queued goes on',
    inject: ({ controller }) => void controller.dropVisitors(),
  },
  {
    name: 'lost-ok',
    target: 'positioner',
    does: 'swallows the next ok or error',
    inject: ({ controller }) => controller.loseAnswers(1),
  },
  {
    name: 'late-ok',
    target: 'positioner',
    does: 'holds the next ok or error back by 0.5 s to 3 s',
    inject: ({ controller, random }) => controller.delayAnswers(1, random.uniform(500, 3000)),
  },
  {
    name: 'restart',
    target: 'positioner',
    does: 'restarts the controller: banner, counter at zero',
    inject: ({ controller }) => controller.restart(),
  },
  {
    name: 'alarm',
    target: 'positioner',
    does: 'a limit input trips: alarm 1, motion stops dead',
    inject: ({ controller }) => controller.raiseAlarm(1),
  },
  {
    name: 'hold-pressed',
    target: 'positioner',
    does: 'someone presses the hold key on the machine',
    inject: ({ controller }) => controller.pressHold(),
  },
  {
    name: 'garbage-status',
    target: 'positioner',
    does: 'the next status report arrives damaged',
    inject: ({ controller, random }) => controller.damageReports(1, (text) => damaged(text, random)),
  },
  {
    name: 'step-loss',
    target: 'positioner',
    does: 'the azimuth motor loses 0.5° to 3° without the controller noticing',
    inject: ({ controller, random }) =>
      controller.loseSteps('X', random.uniform(0.5, 3) * (random.chance(0.5) ? 1 : -1)),
  },
  {
    name: 'stall',
    target: 'positioner',
    does: 'the azimuth motor stands still for 2 s while the controller counts on',
    inject: ({ controller, later }) => {
      controller.stall('X', true);
      later(2000, () => controller.stall('X', false));
    },
  },
  {
    name: 'analyzer-link-drop',
    target: 'analyzer',
    does: 'closes the link',
    inject: ({ dropInstrumentVisitors }) => dropInstrumentVisitors(),
  },
  {
    name: 'garbage-answer',
    target: 'analyzer',
    does: 'the next answer is 1 to 40 bytes of nonsense',
    inject: ({ hooks, random }) => hooks.changeAnswer(() => nonsense(1 + random.integer(40), random)),
  },
  {
    name: 'truncated-block',
    target: 'analyzer',
    does: 'the next data block breaks off',
    inject: ({ hooks, random }) =>
      hooks.changeAnswer(
        (answer) => answer.slice(0, Math.ceil(answer.length * random.uniform(0.3, 0.9))),
        isBlock,
      ),
  },
  {
    name: 'late-answer',
    target: 'analyzer',
    does: 'the next answer comes 2 s to 20 s late',
    inject: ({ hooks, random }) => hooks.delayNextAnswer(random.uniform(2000, 20_000)),
  },
  {
    name: 'hang',
    target: 'analyzer',
    does: 'the instrument hears nothing for 60 s',
    inject: ({ hooks }) => hooks.deafen(60_000),
  },
  {
    name: 'power-cycle',
    target: 'analyzer',
    does: 'the instrument loses power and starts with its default settings',
    inject: ({ powerCycleInstrument }) => powerCycleInstrument(),
  },
  {
    name: 'nan-block',
    target: 'analyzer',
    does: 'the next sweep consists of what is no number',
    inject: ({ hooks }) =>
      hooks.changeTraces((traces) => {
        for (const trace of traces.values()) trace.fill(Number.NaN);
      }),
  },
  {
    name: 'noise-burst',
    target: 'analyzer',
    does: 'a neighbour transmits over a tenth of the band during the next sweep',
    inject: ({ hooks, random }) =>
      hooks.changeTraces((traces) => {
        for (const trace of traces.values()) interfere(trace, random);
      }),
  },
];

export function faultNamed(name: string): Fault | undefined {
  return faults.find((fault) => fault.name === name);
}

function isBlock(answer: Uint8Array): boolean {
  return answer[0] === 0x23;
}

function nonsense(length: number, random: RandomStream): Uint8Array {
  const bytes = Uint8Array.from({ length: length + 1 }, () => 0x21 + random.integer(94));
  bytes[length] = 0x0a;
  return bytes;
}

/** A third of the characters replaced, and the end lost: what a bad contact makes of a line. */
function damaged(text: string, random: RandomStream): string {
  const kept = text.slice(0, Math.max(1, Math.floor(text.length * random.uniform(0.2, 0.9))));
  return [...kept]
    .map((c) => (random.chance(1 / 3) ? String.fromCharCode(0x23 + random.integer(90)) : c))
    .join('');
}

/** A tenth of the points, side by side, get a signal of their own as strong as the strongest point. */
function interfere(trace: Float64Array, random: RandomStream): void {
  const points = trace.length / 2;
  const width = Math.max(1, Math.round(points / 10));
  const first = random.integer(points - width + 1);
  let strongest = 0;
  for (let i = 0; i < points; i += 1) {
    strongest = Math.max(strongest, Math.hypot(trace[2 * i]!, trace[2 * i + 1]!));
  }
  for (let i = first; i < first + width; i += 1) {
    trace[2 * i]! += random.normal(0, strongest);
    trace[2 * i + 1]! += random.normal(0, strongest);
  }
}
