// What a run tells those who watch it: the terminal, later the gateway. The run does not wait for them.
// A `sample` event is the announcement: it comes only when the sample is durable.
import type { ErrorFacts } from '../../drivers/errors.ts';
import type { Position } from '../../drivers/positioner/positioner.ts';
import type { RunRef, RunState, SampleRecord } from '../archive/archive.ts';

export type RunEvent =
  | { kind: 'started'; run: RunRef; steps: number; expectedMs: number }
  | { kind: 'segment'; segment: number; reason: string }
  | { kind: 'homed'; position: Position }
  | { kind: 'sample'; sample: SampleRecord; done: number; steps: number; leftMs: number }
  | {
      kind: 'retry';
      device: Device;
      code: string;
      text: string;
      /** Of the failure; the bytes of an answer that could not be read are among them. */
      facts: ErrorFacts;
      attempt: number;
      waitMs: number;
    }
  | { kind: 'recovered'; device: Device; text: string }
  | { kind: 'trouble'; text: string }
  | { kind: 'ended'; run: RunRef; state: RunState; reason?: string };

export type Device = 'analyzer' | 'positioner';
