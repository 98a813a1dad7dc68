// Commands that say which S-parameters are recorded and hand out their data: numbered traces, of which one
// is active and read from.
import type { Answer, Command } from './command-tree.ts';
import { numberCommand } from './commands-stimulus.ts';
import { Refusal } from './error-queue.ts';
import type { InstrumentState } from './instrument-state.ts';
import type { SParameterName } from './measurement.ts';
import { integerOf, isWord, wordOf } from './parameter-values.ts';
import { limits, type Trace, type TraceFormat } from './settings.ts';
import { formatNumbers } from './trace-format.ts';

const parameterNames: readonly SParameterName[] = ['S11', 'S21', 'S12', 'S22'];
const formatWords = ['MLOGarithmic', 'MLINear', 'PHASe', 'SWR', 'REAL', 'IMAGinary', 'POLar', 'SMITh'];

export function traceCommands(state: InstrumentState): Command[] {
  return [...definitionCommands(state), ...dataCommands(state), ...formatCommands(state)];
}

function definitionCommands(state: InstrumentState): Command[] {
  const indexOf = (suffixes: readonly number[]): number => {
    const number = suffixes[1]!;
    if (number < 1 || number > state.settings.traces.length) throw new Refusal(-114);
    return number - 1;
  };
  return [
    numberCommand(
      'CALCulate#:PARameter:COUNt',
      'none',
      limits.traces,
      () => state.settings.traces.length,
      (count) => state.change(withCount(state.settings.traces, Math.round(count), state.settings.active)),
    ),
    {
      pattern: 'CALCulate#:PARameter#:DEFine',
      takes: [1, 1],
      set: ({ parameters, suffixes }) => {
        const parameter = parameterNames.find((name) => isWord(parameters[0]!, name));
        if (!parameter) throw new Refusal(-224);
        state.change({ traces: replaced(state.settings.traces, indexOf(suffixes), { parameter }) });
      },
      query: ({ suffixes }) => state.settings.traces[indexOf(suffixes)]!.parameter,
    },
    {
      pattern: 'CALCulate#:PARameter#:SELect',
      set: ({ suffixes }) => state.change({ active: indexOf(suffixes) }),
    },
    {
      pattern: 'CALCulate#[:SELected]:FORMat',
      takes: [1, 1],
      set: ({ parameters }) => {
        const format = wordOf(parameters[0]!, ...formatWords) as TraceFormat;
        state.change({ traces: replaced(state.settings.traces, state.settings.active, { format }) });
      },
      query: () => state.settings.traces[state.settings.active]!.format,
    },
  ];
}

function withCount(traces: readonly Trace[], count: number, active: number) {
  const kept = traces.slice(0, count);
  while (kept.length < count) kept.push({ parameter: 'S11', format: 'MLOG' });
  return { traces: kept, active: Math.min(active, count - 1) };
}

function replaced(traces: readonly Trace[], index: number, change: Partial<Trace>): Trace[] {
  return traces.map((trace, i) => (i === index ? { ...trace, ...change } : trace));
}

function dataCommands(state: InstrumentState): Command[] {
  const send = (values: Float64Array): Answer => {
    const { format, swapped } = state.settings;
    return formatNumbers(values, format, swapped);
  };
  const complexData = (): Answer => send(activeData(state).values);
  const formattedData = (): Answer => {
    const { values, trace } = activeData(state);
    return send(formatted(values, trace.format));
  };
  const axis = (): Answer => send(state.runner.frequenciesHz);
  return [
    {
      pattern: 'CALCulate#:DATA',
      asks: [1, 1],
      query: ({ parameters }) =>
        wordOf(parameters[0]!, 'SDATa', 'FDATa') === 'SDAT' ? complexData() : formattedData(),
    },
    { pattern: 'CALCulate#[:SELected]:DATA:SDATa', query: complexData },
    { pattern: 'CALCulate#[:SELected]:DATA:FDATa', query: formattedData },
    { pattern: '[SENSe#]:FREQuency:DATA', query: axis },
    { pattern: 'CALCulate#:X[:VALues]', query: axis },
  ];
}

/** Throws −230 when the active trace has no complete sweep since the last change. */
function activeData({ settings, runner }: InstrumentState): { values: Float64Array; trace: Trace } {
  const trace = settings.traces[settings.active]!;
  const values = runner.read(trace.parameter);
  if (!values) throw new Refusal(-230);
  return { values, trace };
}

/** One number for each point, two in the complex planes. */
function formatted(values: Float64Array, format: TraceFormat): Float64Array {
  if (format === 'POL' || format === 'SMIT') return values;
  return Float64Array.from({ length: values.length / 2 }, (_, i) => {
    const re = values[2 * i]!;
    const im = values[2 * i + 1]!;
    const magnitude = Math.hypot(re, im);
    switch (format) {
      case 'MLOG':
        return 20 * Math.log10(magnitude);
      case 'MLIN':
        return magnitude;
      case 'PHAS':
        return (Math.atan2(im, re) * 180) / Math.PI;
      case 'SWR':
        return magnitude < 1 ? (1 + magnitude) / (1 - magnitude) : Number.POSITIVE_INFINITY;
      case 'REAL':
        return re;
      case 'IMAG':
        return im;
    }
  });
}

function formatCommands(state: InstrumentState): Command[] {
  const digits = { min: 0, max: 12, def: 0 };
  return [
    {
      pattern: 'FORMat[:DATA]',
      takes: [1, 2],
      set: ({ parameters: [word, length] }) => {
        if (wordOf(word!, 'ASCii', 'REAL') === 'ASC') {
          if (length !== undefined) integerOf(length, digits);
          state.change({ format: 'ascii' });
          return;
        }
        const bits = length ?? '64';
        if (bits !== '32' && bits !== '64') throw new Refusal(-224);
        state.change({ format: bits === '32' ? 'real32' : 'real64' });
      },
      query: () => ({ ascii: 'ASC,0', real32: 'REAL,32', real64: 'REAL,64' })[state.settings.format],
    },
    {
      pattern: 'FORMat:BORDer',
      takes: [1, 1],
      set: ({ parameters }) =>
        state.change({ swapped: wordOf(parameters[0]!, 'NORMal', 'SWAPped') === 'SWAP' }),
      query: () => (state.settings.swapped ? 'SWAP' : 'NORM'),
    },
  ];
}
