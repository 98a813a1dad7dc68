// Proof that answers pair with questions on a link just opened, and what the instrument tells on the way.
// Nothing that was there before is believed: not the line buffer (an LF ends what a dead session left
// behind), not the first lines (greetings, late answers), not even the identity, until two different
// marker values have come back in order.
//
//   LF, urgent commands ─► 100 ms thrown away ─► *IDN? (3 lines at most) ─► *ESE a, *ESE? = a
//   ─► *ESE b, *ESE? = b ─► *ESR? (power on?) ─► error queue emptied ─► *CLS
//
// The registers are read before *CLS, for it would wipe out both the news of a power cycle and the reason
// why a question was refused.
import type { Clock } from '../clock.ts';
import { DriverError, isDriverError } from '../errors.ts';
import type { AnalyzerIdentity } from './analyzer.ts';
import { eventBits } from './scpi-status.ts';
import {
  decodeErrorEntry,
  decodeIdentity,
  decodeNumber,
  decodeSetting,
  excerpt,
  looksLikeIdentity,
  type ScpiErrorEntry,
} from './scpi-values.ts';
import type { ScpiWire } from './scpi-wire.ts';

export interface SessionOpening {
  identity: AnalyzerIdentity;
  /** The instrument was switched on since its event register was last read. */
  powerOn: boolean;
  /** What stood in the error queue, oldest first. */
  errors: ScpiErrorEntry[];
}

export interface ProofOptions {
  errorQuery: string;
  answerTimeoutMs: number;
  /** Where the first question is not answered it is asked again until then; 0: asked once. */
  patienceMs: number;
  urgent: readonly string[];
  signal: AbortSignal | undefined;
}

const quietMs = 100;
const linesAtMost = 3;
/** More entries than any queue holds: an instrument that never says "no error" is not waited for. */
export const errorReadsAtMost = 64;
const lineMaxBytes = 4096;
/** Any two different values do; bit 6 stays clear, for some registers do not keep it. */
const markers = [36, 37] as const;

/** See the drawing above. Throws what `ScpiWire.exchange` throws, and ANALYZER_OUT_OF_STEP. */
export async function proveStep(
  wire: ScpiWire,
  clock: Clock,
  options: ProofOptions,
): Promise<SessionOpening> {
  const { signal } = options;
  await wire.shout('');
  for (const message of options.urgent) await wire.shout(message);
  await clock.sleep(quietMs, signal);
  wire.attend('proving');
  const talk = new ProvingTalk(wire, clock, options);
  let identity = await talk.firstIdentity();
  const strayLines = await talk.proveMarker(markers[0], linesAtMost);
  await talk.proveMarker(markers[1], 1);
  // Lines were still in the way: what was taken for the identity may have been one of them.
  if (strayLines > 0) identity = await talk.ask('*IDN?');
  const events = decodeSetting(await talk.ask('*ESR?'));
  const errors = await talk.emptyErrorQueue();
  await talk.tell('*CLS');
  if (wire.holdsRest) {
    throw new DriverError('ANALYZER_OUT_OF_STEP', 'the instrument says more than it is asked');
  }
  wire.attend('strict');
  return { identity: decodeIdentity(identity), powerOn: (events & eventBits.powerOn) !== 0, errors };
}

class ProvingTalk {
  readonly #wire: ScpiWire;
  readonly #clock: Clock;
  readonly #options: ProofOptions;

  constructor(wire: ScpiWire, clock: Clock, options: ProofOptions) {
    this.#wire = wire;
    this.#clock = clock;
    this.#options = options;
  }

  /** `*IDN?` and the first of at most three lines that has the shape of an identity. */
  async firstIdentity(): Promise<string> {
    let line = await this.#firstAnswer('*IDN?');
    for (let read = 1; !looksLikeIdentity(line) && read < linesAtMost; read += 1)
      line = await this.#readLine();
    if (looksLikeIdentity(line)) return line;
    throw new DriverError(
      'ANALYZER_OUT_OF_STEP',
      `none of ${linesAtMost} lines is an identity: '${excerpt(line)}'`,
      {
        answer: excerpt(line),
      },
    );
  }

  /** Sets and asks the marker back; returns how many other lines came first. */
  async proveMarker(value: number, readsAtMost: number): Promise<number> {
    await this.tell(`*ESE ${value}`);
    let line = await this.ask('*ESE?');
    for (let strays = 0; ; strays += 1) {
      if (isMarker(line, value)) return strays;
      if (strays + 1 >= readsAtMost) break;
      line = await this.#readLine();
    }
    throw new DriverError(
      'ANALYZER_OUT_OF_STEP',
      `answers do not pair with questions: '*ESE?' should give ${value} and gives '${excerpt(line)}'`,
      { expected: value, answer: excerpt(line) },
    );
  }

  async emptyErrorQueue(): Promise<ScpiErrorEntry[]> {
    return drainErrorQueue(() => this.ask(this.#options.errorQuery));
  }

  async ask(message: string): Promise<string> {
    return this.#text(message);
  }

  async tell(message: string): Promise<void> {
    const { answerTimeoutMs, signal } = this.#options;
    await this.#wire.exchange({ message, timeoutMs: answerTimeoutMs, signal });
  }

  async #firstAnswer(message: string): Promise<string> {
    const deadlineMs = this.#clock.monotonicMs() + this.#options.patienceMs;
    for (let asked = 1; ; asked += 1) {
      try {
        const line = await this.#text(message);
        if (asked === 1) return line;
        await this.#discardForAWhile();
        return await this.#text(message);
      } catch (error) {
        if (!isDriverError(error, 'ANALYZER_NOT_ANSWERING')) throw error;
        if (this.#clock.monotonicMs() < deadlineMs) continue;
        throw new DriverError(
          'ANALYZER_NOT_ANSWERING',
          'the instrument is connected and says nothing: another program may hold its only session, or it is still starting',
          error.facts,
          error,
        );
      }
    }
  }

  /** An instrument that was late rather than deaf answers every time that it was asked. */
  async #discardForAWhile(): Promise<void> {
    this.#wire.attend('deaf');
    await this.#clock.sleep(quietMs, this.#options.signal);
    this.#wire.attend('proving');
  }

  #readLine(): Promise<string> {
    return this.#text(undefined);
  }

  async #text(message: string | undefined): Promise<string> {
    const { answerTimeoutMs, signal } = this.#options;
    const answer = await this.#wire.exchange({
      ...(message !== undefined && { message }),
      expected: { kind: 'text', maxBytes: lineMaxBytes },
      timeoutMs: answerTimeoutMs,
      signal,
    });
    return answer?.kind === 'text' ? answer.text : '';
  }
}

function isMarker(line: string, value: number): boolean {
  try {
    return decodeNumber(line) === value;
  } catch {
    // Any other line, an old answer for instance: just not the marker.
    return false;
  }
}

/** Entries until "no error", 64 at most; an overflowed queue tells so in its last entry (−350). */
export async function drainErrorQueue(ask: () => Promise<string>): Promise<ScpiErrorEntry[]> {
  const entries: ScpiErrorEntry[] = [];
  for (let read = 0; read < errorReadsAtMost; read += 1) {
    const entry = decodeErrorEntry(await ask());
    if (entry.code === 0) break;
    entries.push(entry);
  }
  return entries;
}
