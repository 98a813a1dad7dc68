// Where the simulated instrument can be made to misbehave. Every hook is optional; `instrument.faults` may
// be changed at any moment. What goes wrong and when is decided by whoever sets the hooks.
import type { SParameterName } from './measurement.ts';

export interface InstrumentFaults {
  /** `lose`: the message is swallowed as if it had never arrived. */
  onMessage?: (message: string) => 'run' | 'lose';
  /** The bytes that leave in place of the answer (line end included); undefined: nothing leaves. */
  onAnswer?: (answer: Uint8Array, message: string) => Uint8Array | undefined;
  /** Holds the answer back, and with it everything after it in this session. */
  delayAnswerMs?: (message: string) => number;
  /** Alters a finished sweep in place. */
  onTraces?: (traces: Map<SParameterName, Float64Array>) => void;
  /** Lengthens the sweep that begins now; Infinity: it never ends. */
  stretchSweepMs?: () => number;
}
