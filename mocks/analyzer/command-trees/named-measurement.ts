// Measurements by name: each is made under a name that is still free, and thrown away under it. Only one that
// stands in a window of the screen is swept; data are those of the selected one, and at first none is selected.
import type { Command } from '../command-tree.ts';
import { selectedDataCommands, sParameterOf, stringOf } from '../commands-traces.ts';
import { Refusal } from '../error-queue.ts';
import type { InstrumentState } from '../instrument-state.ts';
import { limits, type Trace } from '../settings.ts';

export function namedMeasurementCommands(state: InstrumentState): Command[] {
  const indexOf = (text: string): number => {
    const name = stringOf(text);
    const index = state.settings.traces.findIndex((trace) => trace.name === name);
    if (index < 0) throw new Refusal(-224, name);
    return index;
  };
  return [
    {
      pattern: 'CALCulate#:PARameter:DEFine[:EXTended]',
      takes: [2, 2],
      set: ({ parameters: [name, parameter] }) =>
        state.change({ traces: withOneMore(state.settings.traces, stringOf(name!), unquoted(parameter!)) }),
    },
    {
      pattern: 'CALCulate#:PARameter:SELect',
      takes: [1, 1],
      set: ({ parameters }) => state.change({ active: indexOf(parameters[0]!) }),
      query: () => `"${state.settings.traces[state.settings.active]?.name ?? ''}"`,
    },
    {
      pattern: 'CALCulate#:PARameter:CATalog',
      query: () => `"${state.settings.traces.flatMap(({ name, parameter }) => [name, parameter]).join(',')}"`,
    },
    {
      pattern: 'CALCulate#:PARameter:DELete',
      takes: [1, 1],
      set: ({ parameters }) => {
        const gone = indexOf(parameters[0]!);
        state.change({ traces: state.settings.traces.filter((_, i) => i !== gone), active: -1 });
      },
    },
    {
      pattern: 'CALCulate#:PARameter:DELete:ALL',
      set: () => state.change({ traces: [], active: -1 }),
    },
    ...displayCommands(state, indexOf),
    ...selectedDataCommands(state),
  ];
}

function displayCommands(state: InstrumentState, indexOf: (text: string) => number): Command[] {
  return [
    {
      pattern: 'DISPlay:WINDow#:TRACe#:FEED',
      takes: [1, 1],
      set: ({ parameters, suffixes }) => {
        const { traces } = state.settings;
        const index = indexOf(parameters[0]!);
        const number = suffixes[1]!;
        if (traces.some((trace, i) => i !== index && trace.shown && trace.number === number)) {
          throw new Refusal(-221);
        }
        state.change({
          traces: traces.map((trace, i) => (i === index ? { ...trace, number, shown: true } : trace)),
        });
      },
    },
  ];
}

/** Throws −221 for a name that is taken, or for one too many. */
function withOneMore(traces: readonly Trace[], name: string, parameter: string): Trace[] {
  if (name === '' || traces.some((trace) => trace.name === name)) throw new Refusal(-221, name);
  if (traces.length >= limits.traces.max) throw new Refusal(-221);
  return [...traces, { parameter: sParameterOf(parameter), format: 'MLOG', name, number: 0, shown: false }];
}

/** The S-parameter may stand in quotes or not. */
function unquoted(text: string): string {
  return /^["']/.test(text) ? stringOf(text) : text;
}
