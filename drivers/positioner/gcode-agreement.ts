// Which answers prove that controller and sender count alike again, after one that never came. Pure: fed with
// the lines that come, it knows nothing of time.
//
//   sent      # (one more each round)   $G
//   wanted    error … error             [GC:…]   ok      in this order, with nothing in between
//
// The `#` also spoils half a line that may be left in the controller, so that it is refused instead of run in
// part. What was owed before comes first, and may be a parser state itself; but not behind that many refusals.
import type { ControllerLine } from './gcode-reports.ts';

/** `perhaps`: all is answered, and no parser state was printed; true if nothing more comes. */
export type Agreement = 'not yet' | 'perhaps' | 'agreed';

export class AgreementWatch {
  /** What to send. */
  readonly wire: string;
  readonly #refusalsWanted: number;
  #refusalsInRow = 0;
  #answers = 0;
  #stateSeen = false;

  /** `round`: 0 at first; answers to the rounds before may still be on their way. */
  constructor(round: number) {
    this.#refusalsWanted = round + 1;
    this.wire = `${'#\n'.repeat(this.#refusalsWanted)}$G\n`;
  }

  take(line: ControllerLine): Agreement {
    if (isParserState(line)) this.#stateSeen = this.#refusalsInRow >= this.#refusalsWanted;
    if (line.kind !== 'ok' && line.kind !== 'error') return 'not yet';
    if (this.#stateSeen) return 'agreed';
    this.#answers += 1;
    this.#refusalsInRow = line.kind === 'error' ? this.#refusalsInRow + 1 : 0;
    return this.#answers > this.#refusalsWanted ? 'perhaps' : 'not yet';
  }
}

export function isParserState(line: ControllerLine): boolean {
  return line.kind === 'data' && line.key === 'GC';
}
