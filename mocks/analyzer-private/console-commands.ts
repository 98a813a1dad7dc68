// The words of a low-cost analyzer's console and what they do. One word and numbers behind it, parted by blanks; a
// word without numbers asks. Anything it does not understand is answered with a sentence, never with a code.
import type { ConsoleState } from './console-state.ts';

/** Lines to print; none for a setting that was understood. */
export type ConsoleAnswer = readonly string[] | Promise<readonly string[]>;

type ConsoleCommand = (state: ConsoleState, numbers: readonly number[]) => ConsoleAnswer;

const commands: Readonly<Record<string, ConsoleCommand>> = {
  help: () => ['words: help version bandwidth scan'],
  version: (state) => [state.version],
  bandwidth: (state, [hz]) => {
    if (hz === undefined) return [`bandwidth ${state.bandwidthHz} Hz`];
    return state.setBandwidth(hz) ? [] : [`bandwidth is one of ${state.bandwidthsHz.join(' ')}`];
  },
  scan: (state, [startHz, stopHz, points, mask]) => {
    if (startHz === undefined || stopHz === undefined || points === undefined || mask === undefined) {
      return ['scan needs start stop points mask'];
    }
    return state.scan(startHz, stopHz, points, mask);
  },
};

/** Executes one line. */
export function executeLine(state: ConsoleState, line: string): ConsoleAnswer {
  const [word = '', ...written] = line.trim().split(/ +/);
  if (word === '') return [];
  const command = Object.hasOwn(commands, word) ? commands[word] : undefined;
  const numbers = written.map(Number);
  if (!command) return [`what is ${word}?`];
  return numbers.some((number) => !Number.isFinite(number))
    ? [`${word} wants numbers`]
    : command(state, numbers);
}
