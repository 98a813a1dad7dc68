// What a G-code line means: modes remembered from line to line, targets computed, one list of acts handed
// back, or the number of an error with nothing changed. Moves nothing itself. Arcs, probing and canned
// cycles are not built: a stage has no use for them (error 20).
import { type Refusal, type Word, wordsOf } from './gcode-words.ts';
import { type AxisLetter, axisLetters, type ControllerTraits } from './traits.ts';
import type { WorkOffsets } from './work-offsets.ts';

export type Act =
  | { kind: 'move'; target: number[]; speed: number; rapid: boolean }
  | { kind: 'dwell'; seconds: number }
  /** Something non-volatile was written: the line is confirmed when motion has ended. */
  | { kind: 'drain' }
  | { kind: 'pause' }
  | { kind: 'remark'; text: string };

interface Modes {
  motion: number;
  plane: number;
  units: number;
  distance: number;
  feedMode: number;
  feed: number;
  tool: number;
}

/** What one line asks for, sorted into modal groups. */
interface Request {
  codes: Map<string, number>;
  axes: Map<number, number>;
  values: Map<string, number>;
}

const groupOfCode: Readonly<Record<string, string>> = {
  G0: 'motion',
  G1: 'motion',
  G80: 'motion',
  G4: 'once',
  G10: 'once',
  G28: 'once',
  G30: 'once',
  G53: 'once',
  G92: 'once',
  'G92.1': 'once',
  'G28.1': 'once',
  'G30.1': 'once',
  G17: 'plane',
  G18: 'plane',
  G19: 'plane',
  G90: 'distance',
  G91: 'distance',
  G93: 'feedMode',
  G94: 'feedMode',
  G20: 'units',
  G21: 'units',
  G40: 'cutter',
  G49: 'tool',
  G61: 'control',
  M0: 'flow',
  M1: 'flow',
  M2: 'flow',
  M30: 'flow',
  M3: 'spindle',
  M4: 'spindle',
  M5: 'spindle',
  M7: 'coolant',
  M8: 'coolant',
  M9: 'coolant',
  ...Object.fromEntries([54, 55, 56, 57, 58, 59].map((code) => [`G${code}`, 'system'])),
};

const usesAxes = new Set(['G10', 'G28', 'G30', 'G92', 'G28.1', 'G30.1']);
const millimetresPerInch = 25.4;

export class GcodeReader {
  readonly #traits: ControllerTraits;
  readonly #offsets: WorkOffsets;
  #modes: Modes = freshModes();
  /** Machine coordinates the next move starts from, not rounded to steps. */
  position: number[];

  constructor(traits: ControllerTraits, offsets: WorkOffsets) {
    this.#traits = traits;
    this.#offsets = offsets;
    this.position = new Array<number>(traits.axisCount).fill(0);
  }

  reset(): void {
    this.#modes = freshModes();
    this.#offsets.reset();
  }

  /** The line of `$G`. */
  modeLine(): string {
    const m = this.#modes;
    const system = 54 + this.#offsets.selected;
    const point = this.#traits.errorsStick ? '.' : '';
    return `[GC:G${m.motion} G${system} G${m.plane} G${m.units} G${m.distance} G${m.feedMode} ${this.#traits.modeTail.replace('T0', `T${m.tool}`)} F${Number(m.feed.toFixed(3))} S0${point}]`;
  }

  /** Reads a condensed line and carries out what needs no motion. */
  read(line: string): Act[] | Refusal {
    const request = this.#sort(line);
    if ('error' in request) return request;
    const { codes, axes, values } = request;
    const next: Modes = { ...this.#modes };
    for (const key of ['motion', 'plane', 'units', 'distance', 'feedMode'] as const) {
      next[key] = codes.get(key) ?? next[key];
    }
    // Feed per minute and feed per move are different quantities: changing the mode forgets the number.
    if (next.feedMode !== this.#modes.feedMode) next.feed = 0;
    const scale = next.units === 20 ? millimetresPerInch : 1;
    const feed = take(values, 'F');
    if (feed !== undefined) next.feed = feed * (next.feedMode === 94 ? scale : 1);
    next.tool = take(values, 'T') ?? next.tool;
    take(values, 'S');
    take(values, 'N');
    const once = codes.get('once');
    const system = codes.get('system');
    const restore = this.#offsets.restorePoint();
    if (system !== undefined) this.#offsets.selected = system - 54;
    const acts = this.#acts(once, axes, values, next, feed);
    if ('error' in acts || values.size > 0) {
      restore();
      return 'error' in acts ? acts : { error: 36 };
    }
    this.#modes = next;
    if (codes.get('flow') === 0) acts.push({ kind: 'pause' });
    if ((codes.get('flow') ?? 0) >= 2) {
      this.#modes = { ...freshModes(), feed: next.feed, feedMode: 94 };
      acts.push({ kind: 'drain' }, { kind: 'remark', text: 'Pgm End' });
    }
    return acts;
  }

  /** A `$J=` line: own feed, own distance and units, no mode touched. */
  readJog(line: string): Act[] | Refusal {
    const request = this.#sort(line);
    if ('error' in request) return request;
    const { codes, axes, values } = request;
    const allowed = new Set(['units', 'distance', 'once']);
    for (const [group, code] of codes) {
      if (!allowed.has(group) || (group === 'once' && code !== 53)) return { error: 16 };
    }
    const feed = take(values, 'F');
    if (!feed) return { error: 22 };
    take(values, 'N');
    if (values.size > 0) return { error: 36 };
    const modes: Modes = { ...this.#modes, feedMode: 94 };
    modes.units = codes.get('units') ?? modes.units;
    modes.distance = codes.get('distance') ?? modes.distance;
    const target = this.#target(axes, modes, codes.get('once') === 53);
    const speed = (feed * this.#feedScale(axes, modes)) / 60;
    return [{ kind: 'move', target, speed, rapid: false }];
  }

  #acts(
    once: number | undefined,
    axes: ReadonlyMap<number, number>,
    values: Map<string, number>,
    modes: Modes,
    feed: number | undefined,
  ): Act[] | Refusal {
    if (once === 4) {
      const seconds = take(values, 'P');
      if (seconds === undefined) return { error: 28 };
      const move = axes.size > 0 ? this.#move(axes, modes, false, feed) : [];
      return 'error' in move ? move : [{ kind: 'dwell', seconds }, ...move];
    }
    if (once === 10) return this.#storeSystem(axes, values, modes);
    if (once === 92) return this.#shiftZero(axes, modes);
    if (once === 92.1) {
      this.#offsets.shift = this.#offsets.shift.map(() => 0);
      return [];
    }
    if (once === 28 || once === 30) return this.#goToPlace(once === 28 ? 0 : 1, axes, modes);
    if (once === 28.1 || once === 30.1) {
      this.#offsets.places[once === 28.1 ? 0 : 1] = [...this.position];
      return [{ kind: 'drain' }];
    }
    if (once === 53 && modes.motion !== 0 && modes.motion !== 1) return { error: 30 };
    // A motion word alone only sets the mode.
    if (axes.size === 0) return [];
    if (modes.motion === 80) return { error: 31 };
    return this.#move(axes, modes, once === 53, feed);
  }

  #move(
    axes: ReadonlyMap<number, number>,
    modes: Modes,
    inMachine: boolean,
    feed: number | undefined,
  ): Act[] | Refusal {
    if (modes.motion === 1 && (modes.feed === 0 || (modes.feedMode === 93 && feed === undefined))) {
      return { error: 22 };
    }
    const from = this.position;
    const target = this.#target(axes, modes, inMachine);
    if (modes.motion === 0) return [{ kind: 'move', target, speed: Infinity, rapid: true }];
    const length = Math.hypot(...target.map((value, axis) => value - from[axis]!));
    const perMinute = modes.feedMode === 93 ? modes.feed * length : modes.feed;
    const rotaryOnly = modes.units === 20 && modes.feedMode === 94 && onlyRotary(axes);
    return [
      {
        kind: 'move',
        target,
        speed: perMinute / (rotaryOnly ? millimetresPerInch : 1) / 60,
        rapid: false,
      },
    ];
  }

  #target(axes: ReadonlyMap<number, number>, modes: Modes, inMachine: boolean): number[] {
    const offset = this.#offsets.total;
    return this.position.map((value, axis) => {
      const word = axes.get(axis);
      if (word === undefined) return value;
      const scaled = word * axisScale(axis, modes);
      if (inMachine) return scaled;
      return modes.distance === 91 ? value + scaled : scaled + offset[axis]!;
    });
  }

  #feedScale(axes: ReadonlyMap<number, number>, modes: Modes): number {
    return modes.units === 20 && !onlyRotary(axes) ? millimetresPerInch : 1;
  }

  #storeSystem(
    axes: ReadonlyMap<number, number>,
    values: Map<string, number>,
    modes: Modes,
  ): Act[] | Refusal {
    if (axes.size === 0) return { error: 26 };
    const way = take(values, 'L');
    const which = take(values, 'P');
    if (way === undefined || which === undefined) return { error: 28 };
    if (way !== 2 && way !== 20) return { error: 20 };
    if (which < 0 || which > 6) return { error: 29 };
    const system = this.#offsets.systems[which === 0 ? this.#offsets.selected : which - 1]!;
    for (const [axis, word] of axes) {
      const value = word * axisScale(axis, modes);
      system[axis] = way === 2 ? value : this.position[axis]! - this.#offsets.shift[axis]! - value;
    }
    return [{ kind: 'drain' }];
  }

  #shiftZero(axes: ReadonlyMap<number, number>, modes: Modes): Act[] | Refusal {
    if (axes.size === 0) return { error: 26 };
    const base = this.#offsets.systems[this.#offsets.selected]!;
    for (const [axis, word] of axes) {
      this.#offsets.shift[axis] = this.position[axis]! - base[axis]! - word * axisScale(axis, modes);
    }
    return [];
  }

  #goToPlace(place: 0 | 1, axes: ReadonlyMap<number, number>, modes: Modes): Act[] {
    const rapid = (target: number[]): Act => ({ kind: 'move', target, speed: Infinity, rapid: true });
    const stored = this.#offsets.places[place]!;
    if (axes.size === 0) return [rapid([...stored])];
    const between = this.#target(axes, modes, false);
    return [rapid(between), rapid(between.map((value, axis) => (axes.has(axis) ? stored[axis]! : value)))];
  }

  #sort(line: string): Request | Refusal {
    const words = wordsOf(line);
    if ('error' in words) return words;
    const request: Request = { codes: new Map(), axes: new Map(), values: new Map() };
    for (const word of words) {
      const refusal = 'GM'.includes(word.letter)
        ? this.#sortCode(word, request)
        : this.#sortValue(word, request);
      if (refusal) return refusal;
    }
    const once = [...request.codes].find(([group]) => group === 'once');
    const motion = request.codes.get('motion');
    const wantsAxes = once !== undefined && usesAxes.has(`G${once[1]}`);
    if (wantsAxes && (motion === 0 || motion === 1) && request.axes.size > 0) return { error: 24 };
    return request;
  }

  #sortCode(word: Word, request: Request): Refusal | undefined {
    const isWholeNumber = Number.isInteger(word.value);
    // The classic edition keeps M numbers in one byte and takes a larger one for a fraction.
    const tooLarge = word.value > 255 && !this.#traits.leftOverWords;
    if (word.letter === 'M' && (!isWholeNumber || tooLarge)) return { error: 23 };
    const group = groupOfCode[`${word.letter}${word.value}`];
    if (!group) return { error: 20 };
    if (request.codes.has(group)) return { error: 21 };
    request.codes.set(group, word.value);
    return undefined;
  }

  #sortValue(word: Word, request: Request): Refusal | undefined {
    const axis = axisLetters.indexOf(word.letter as AxisLetter);
    if (axis >= 0 && axis < this.#traits.axisCount) {
      if (request.axes.has(axis)) return { error: 25 };
      request.axes.set(axis, word.value);
      return undefined;
    }
    if (!'FIJKLNPRST'.includes(word.letter)) {
      if (!this.#traits.leftOverWords) return { error: 20 };
      request.values.set(word.letter, word.value);
      return undefined;
    }
    if (request.values.has(word.letter)) return { error: 25 };
    if ('FNPST'.includes(word.letter) && word.value < 0) return { error: 4 };
    request.values.set(word.letter, word.value);
    return undefined;
  }
}

function freshModes(): Modes {
  return { motion: 0, plane: 17, units: 21, distance: 90, feedMode: 94, feed: 0, tool: 0 };
}

function take(values: Map<string, number>, letter: string): number | undefined {
  const value = values.get(letter);
  values.delete(letter);
  return value;
}

/** Inches concern linear axes only: the fourth axis turns. */
function axisScale(axis: number, modes: Modes): number {
  return modes.units === 20 && axis < 3 ? millimetresPerInch : 1;
}

function onlyRotary(axes: ReadonlyMap<number, number>): boolean {
  return axes.size > 0 && [...axes.keys()].every((axis) => axis === 3);
}
