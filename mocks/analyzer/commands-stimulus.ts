// Commands that say what is swept, how, and when: the SENSe, SOURce, OUTPut, INITiate and TRIGger branches.
import type { Command } from './command-tree.ts';
import { Refusal } from './error-queue.ts';
import type { InstrumentState } from './instrument-state.ts';
import { booleanOf, type Limits, limitOf, numberOf, type Unitage, wordOf } from './parameter-values.ts';
import {
  existingBandwidthHz,
  limits,
  type Settings,
  type SweepType,
  type TriggerSource,
  withCenterAndSpan,
  withStart,
  withStop,
} from './settings.ts';
import { plain } from './trace-format.ts';

/** `isInitiated`: sweeps are started by INITiate; else the command tree has another way. */
export function stimulusCommands(state: InstrumentState, isInitiated: boolean): Command[] {
  return [
    ...frequencyCommands(state),
    ...sweepCommands(state),
    ...sourceCommands(state),
    ...triggerCommands(state, isInitiated),
  ];
}

/** A number that can be set and asked; asked with MIN, MAX or DEF it tells that limit. */
export function numberCommand(
  pattern: string,
  unitage: Unitage,
  range: Limits,
  get: () => number,
  set: (value: number) => void,
): Command {
  return {
    pattern,
    takes: [1, 1],
    set: ({ parameters }) => set(numberOf(parameters[0]!, unitage, range)),
    asks: [0, 1],
    query: ({ parameters }) => {
      const [which] = parameters;
      if (which === undefined) return plain(get());
      const limit = limitOf(which, range);
      if (limit === undefined) throw new Refusal(-224);
      return plain(limit);
    },
  };
}

export function booleanCommand(pattern: string, get: () => boolean, set: (on: boolean) => void): Command {
  return {
    pattern,
    takes: [1, 1],
    set: ({ parameters }) => set(booleanOf(parameters[0]!)),
    query: () => (get() ? '1' : '0'),
  };
}

function wordCommand(
  pattern: string,
  words: readonly string[],
  get: () => string,
  set: (word: string) => void,
): Command {
  return {
    pattern,
    takes: [1, 1],
    set: ({ parameters }) => set(wordOf(parameters[0]!, ...words)),
    query: get,
  };
}

function frequencyCommands(state: InstrumentState): Command[] {
  const range = limits.frequencyHz;
  const span = { min: 0, max: range.max - range.min, def: range.max - range.min };
  const now = (): Settings => state.settings;
  const center = (): number => (now().startHz + now().stopHz) / 2;
  const width = (): number => now().stopHz - now().startHz;
  const setter = (toEnds: (value: number) => Partial<Settings>) => (value: number) =>
    state.change(toEnds(value));
  const frequency = (
    node: string,
    get: () => number,
    toEnds: (value: number) => Partial<Settings>,
    within: Limits,
  ) => numberCommand(`[SENSe#]:FREQuency${node}`, 'frequency', within, get, setter(toEnds));
  return [
    frequency(
      ':STARt',
      () => now().startHz,
      (hz) => withStart(hz, now().stopHz),
      range,
    ),
    frequency(
      ':STOP',
      () => now().stopHz,
      (hz) => withStop(now().startHz, hz),
      range,
    ),
    frequency(':CENTer', center, (hz) => withCenterAndSpan(hz, width()), range),
    frequency(':SPAN', width, (hz) => withCenterAndSpan(center(), hz), span),
    frequency(
      '[:CW]',
      () => now().cwHz,
      (cwHz) => ({ cwHz }),
      range,
    ),
  ];
}

function sweepCommands(state: InstrumentState): Command[] {
  const now = (): Settings => state.settings;
  const bandwidth = (pattern: string): Command =>
    numberCommand(
      pattern,
      'frequency',
      limits.ifBandwidthHz,
      () => now().ifBandwidthHz,
      (hz) => state.change({ ifBandwidthHz: existingBandwidthHz(hz) }),
    );
  return [
    numberCommand(
      '[SENSe#]:SWEep:POINts',
      'none',
      limits.points,
      () => now().points,
      (points) => state.change({ points: Math.round(points) }),
    ),
    wordCommand(
      '[SENSe#]:SWEep:TYPE',
      ['LINear', 'LOGarithmic', 'CW'],
      () => now().sweepType,
      (word) => state.change({ sweepType: word as SweepType }),
    ),
    { pattern: '[SENSe#]:SWEep:TIME', query: () => plain(state.runner.sweepMs / 1000) },
    booleanCommand(
      '[SENSe#]:SWEep:TIME:AUTO',
      () => true,
      (on) => {
        if (!on) throw new Refusal(-221);
      },
    ),
    numberCommand(
      '[SENSe#]:SWEep:DWELl',
      'time',
      limits.dwellS,
      () => now().dwellS,
      (dwellS) => state.change({ dwellS }),
    ),
    bandwidth('[SENSe#]:BANDwidth[:RESolution]'),
    bandwidth('[SENSe#]:BWIDth[:RESolution]'),
    booleanCommand(
      '[SENSe#]:AVERage[:STATe]',
      () => now().averagingOn,
      (averagingOn) => state.change({ averagingOn }),
    ),
    numberCommand(
      '[SENSe#]:AVERage:COUNt',
      'none',
      limits.averages,
      () => now().averages,
      (count) => state.change({ averages: Math.round(count) }),
    ),
    wordCommand(
      '[SENSe#]:AVERage:MODE',
      ['POINt', 'SWEep'],
      () => now().averagingMode,
      (word) => state.change({ averagingMode: word as 'POIN' | 'SWE' }),
    ),
    { pattern: '[SENSe#]:AVERage:CLEar', set: () => {} },
    booleanCommand(
      '[SENSe#]:CORRection[:STATe]',
      () => now().correctionOn,
      (correctionOn) => {
        if (correctionOn && !state.calibrated) throw new Refusal(-221);
        state.change({ correctionOn });
      },
    ),
    booleanCommand(
      '[SENSe#]:CORRection:INTerpolate[:STATe]',
      () => now().interpolationOn,
      (interpolationOn) => state.change({ interpolationOn }),
    ),
  ];
}

function sourceCommands(state: InstrumentState): Command[] {
  const now = (): Settings => state.settings;
  return [
    numberCommand(
      'SOURce#:POWer#[:LEVel][:IMMediate][:AMPLitude]',
      'level',
      limits.powerDbm,
      () => now().powerDbm,
      (dbm) => state.change({ powerDbm: Math.round(dbm * 100) / 100 }),
    ),
    booleanCommand(
      'SOURce#:POWer#:COUPle',
      () => true,
      (on) => {
        if (!on) throw new Refusal(-221);
      },
    ),
    booleanCommand(
      'OUTPut#[:STATe]',
      () => now().outputOn,
      (outputOn) => state.change({ outputOn }),
    ),
  ];
}

function triggerCommands(state: InstrumentState, isInitiated: boolean): Command[] {
  const sources = ['IMMediate', 'INTernal', 'BUS', 'MANual', 'EXTernal'];
  const continuous = (pattern: string): Command =>
    booleanCommand(
      pattern,
      () => state.settings.continuous,
      (on) => state.change({ continuous: on }),
    );
  const initiation = [
    { pattern: 'INITiate#[:IMMediate]', set: () => state.initiate() },
    continuous('INITiate#:CONTinuous'),
    continuous('INITiate#:CONTinuous:ALL'),
  ];
  return [
    ...(isInitiated ? initiation : []),
    { pattern: 'ABORt', set: () => state.runner.abort() },
    wordCommand(
      'TRIGger[:SEQuence]:SOURce',
      sources,
      () => state.settings.triggerSource,
      (word) => state.change({ triggerSource: word as TriggerSource }),
    ),
    { pattern: 'TRIGger[:SEQuence][:IMMediate]', set: () => state.trigger() },
    { pattern: 'TRIGger[:SEQuence]:SINGle', set: () => state.trigger() },
    booleanCommand(
      'DISPlay:ENABle',
      () => true,
      () => {},
    ),
  ];
}
