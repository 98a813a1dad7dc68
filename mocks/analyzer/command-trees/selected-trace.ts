// Trace first: every header names the trace it means by number, also that which asks for its data, so that
// nothing is ever selected; and sweeping is a mode: on and on, one sweep, or held.
import type { Command } from '../command-tree.ts';
import {
  axis,
  complexData,
  formattedData,
  replaced,
  sParameterOf,
  stringOf,
  traceFormatOf,
} from '../commands-traces.ts';
import { Refusal } from '../error-queue.ts';
import type { InstrumentState } from '../instrument-state.ts';
import { wordOf } from '../parameter-values.ts';
import { limits, type Trace } from '../settings.ts';

export function selectedTraceCommands(state: InstrumentState): Command[] {
  const traceOf = (suffixes: readonly number[]): Trace => state.settings.traces[indexOf(suffixes)]!;
  const indexOf = (suffixes: readonly number[]): number => {
    const index = state.settings.traces.findIndex((trace) => trace.number === suffixes[1]);
    if (index < 0) throw new Refusal(-114);
    return index;
  };
  return [
    {
      pattern: 'CALCulate#:MEASure#:DEFine',
      takes: [1, 1],
      set: ({ parameters, suffixes }) =>
        state.change({ traces: withTrace(state.settings.traces, suffixes[1]!, stringOf(parameters[0]!)) }),
      query: ({ suffixes }) => `"${traceOf(suffixes).parameter}"`,
    },
    {
      pattern: 'CALCulate#:MEASure#:DELete',
      set: ({ suffixes }) => {
        const gone = indexOf(suffixes);
        state.change({ traces: state.settings.traces.filter((_, i) => i !== gone) });
      },
    },
    { pattern: 'CALCulate#:MEASure:DELete:ALL', set: () => state.change({ traces: [] }) },
    {
      pattern: 'CALCulate#:MEASure:CATalog',
      query: () => `"${state.settings.traces.map(({ number }) => number).join(',')}"`,
    },
    {
      pattern: 'CALCulate#:MEASure#:FORMat',
      takes: [1, 1],
      set: ({ parameters, suffixes }) => {
        const format = traceFormatOf(parameters[0]!);
        state.change({ traces: replaced(state.settings.traces, indexOf(suffixes), { format }) });
      },
      query: ({ suffixes }) => traceOf(suffixes).format,
    },
    {
      pattern: 'CALCulate#:MEASure#:DATA:SDATa',
      query: ({ suffixes }) => complexData(state, traceOf(suffixes)),
    },
    {
      pattern: 'CALCulate#:MEASure#:DATA:FDATa',
      query: ({ suffixes }) => formattedData(state, traceOf(suffixes)),
    },
    {
      pattern: 'CALCulate#:MEASure#:X[:VALues]',
      query: ({ suffixes }) => {
        indexOf(suffixes);
        return axis(state);
      },
    },
    sweepModeCommand(state),
  ];
}

function sweepModeCommand(state: InstrumentState): Command {
  return {
    pattern: '[SENSe#]:SWEep:MODE',
    takes: [1, 1],
    set: ({ parameters }) => {
      const mode = wordOf(parameters[0]!, 'HOLD', 'SINGle', 'CONTinuous');
      state.change({ continuous: mode === 'CONT' });
      if (mode === 'SING') state.initiate();
    },
    query: () => (state.settings.continuous ? 'CONT' : state.runner.isSweeping ? 'SING' : 'HOLD'),
  };
}

/** Throws −114 for a number that no trace can have. */
function withTrace(traces: readonly Trace[], number: number, parameterWord: string): Trace[] {
  if (number < 1 || number > limits.traces.max) throw new Refusal(-114);
  const parameter = sParameterOf(parameterWord);
  const index = traces.findIndex((trace) => trace.number === number);
  if (index >= 0) return replaced(traces, index, { parameter });
  return [...traces, { parameter, format: 'MLOG', name: '', number, shown: true }];
}
