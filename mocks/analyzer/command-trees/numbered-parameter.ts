// Traces by number: how many there are is set, each has an S-parameter, and data are those of the selected one.
import type { Command } from '../command-tree.ts';
import { numberCommand } from '../commands-stimulus.ts';
import { replaced, selectedDataCommands, sParameterOf } from '../commands-traces.ts';
import { Refusal } from '../error-queue.ts';
import type { InstrumentState } from '../instrument-state.ts';
import { limits, type Trace } from '../settings.ts';

export function numberedParameterCommands(state: InstrumentState): Command[] {
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
        const parameter = sParameterOf(parameters[0]!);
        state.change({ traces: replaced(state.settings.traces, indexOf(suffixes), { parameter }) });
      },
      query: ({ suffixes }) => state.settings.traces[indexOf(suffixes)]!.parameter,
    },
    {
      pattern: 'CALCulate#:PARameter#:SELect',
      set: ({ suffixes }) => state.change({ active: indexOf(suffixes) }),
    },
    ...selectedDataCommands(state),
  ];
}

function withCount(traces: readonly Trace[], count: number, active: number) {
  const kept = traces.slice(0, count);
  while (kept.length < count) {
    kept.push({ parameter: 'S11', format: 'MLOG', name: '', number: kept.length + 1, shown: true });
  }
  return { traces: kept, active: Math.min(active, count - 1) };
}
