// What all command trees have in common about traces: their data as numbers, and the commands for the form in
// which numbers are sent. How traces are defined and chosen is in command-trees/.
import type { Answer, Command } from './command-tree.ts';
import { Refusal } from './error-queue.ts';
import type { InstrumentState } from './instrument-state.ts';
import type { SParameterName } from './measurement.ts';
import { integerOf, isWord, wordOf } from './parameter-values.ts';
import type { Settings, Trace, TraceFormat } from './settings.ts';
import { formatNumbers } from './trace-format.ts';

const parameterNames: readonly SParameterName[] = ['S11', 'S21', 'S12', 'S22'];
const formatWords = ['MLOGarithmic', 'MLINear', 'PHASe', 'SWR', 'REAL', 'IMAGinary', 'POLar', 'SMITh'];

/** The S-parameter that a word means. Throws −224. */
export function sParameterOf(word: string): SParameterName {
  const parameter = parameterNames.find((name) => isWord(word, name));
  if (!parameter) throw new Refusal(-224);
  return parameter;
}

/** What stands between quotes of either kind. Throws −104 where there are none. */
export function stringOf(text: string): string {
  const quoted = /^(["'])(.*)\1$/.exec(text);
  if (!quoted) throw new Refusal(-104);
  return quoted[2]!;
}

export function traceFormatOf(word: string): TraceFormat {
  return wordOf(word, ...formatWords) as TraceFormat;
}

/** The selected trace. Throws −221 when none is. */
export function activeTrace({ traces, active }: Settings): Trace {
  const trace = traces[active];
  if (!trace) throw new Refusal(-221);
  return trace;
}

export function replaced(traces: readonly Trace[], index: number, change: Partial<Trace>): Trace[] {
  return traces.map((trace, i) => (i === index ? { ...trace, ...change } : trace));
}

/** Throws −230 when the trace has no complete sweep since the last change. */
export function complexData(state: InstrumentState, trace: Trace): Answer {
  return numbersOf(state, valuesOf(state, trace));
}

/** As the screen shows it. Throws like complexData. */
export function formattedData(state: InstrumentState, trace: Trace): Answer {
  return numbersOf(state, formatted(valuesOf(state, trace), trace.format));
}

export function axis(state: InstrumentState): Answer {
  return numbersOf(state, state.runner.frequenciesHz);
}

function numbersOf({ settings }: InstrumentState, values: Float64Array): Answer {
  return formatNumbers(values, settings.format, settings.swapped);
}

function valuesOf({ runner }: InstrumentState, { parameter }: Trace): Float64Array {
  const values = runner.read(parameter);
  if (!values) throw new Refusal(-230);
  return values;
}

/** Data of the selected trace: how two of the three trees read them. */
export function selectedDataCommands(state: InstrumentState): Command[] {
  const complex = (): Answer => complexData(state, activeTrace(state.settings));
  const shown = (): Answer => formattedData(state, activeTrace(state.settings));
  return [
    {
      pattern: 'CALCulate#:DATA',
      asks: [1, 1],
      query: ({ parameters }) => (wordOf(parameters[0]!, 'SDATa', 'FDATa') === 'SDAT' ? complex() : shown()),
    },
    { pattern: 'CALCulate#[:SELected]:DATA:SDATa', query: complex },
    { pattern: 'CALCulate#[:SELected]:DATA:FDATa', query: shown },
    {
      pattern: 'CALCulate#[:SELected]:FORMat',
      takes: [1, 1],
      set: ({ parameters }) => {
        const format = traceFormatOf(parameters[0]!);
        state.change({ traces: replaced(state.settings.traces, state.settings.active, { format }) });
      },
      query: () => activeTrace(state.settings).format,
    },
    { pattern: 'CALCulate#:X[:VALues]', query: () => axis(state) },
  ];
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

export function formatCommands(state: InstrumentState): Command[] {
  const digits = { min: 0, max: 12, def: 0 };
  return [
    { pattern: '[SENSe#]:FREQuency:DATA', query: () => axis(state) },
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
