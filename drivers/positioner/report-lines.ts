// What a line of a position-report controller means. Pure: text in, a value out. A line that is damaged is a
// remark and nothing more: the answer it was meant to be then counts as lost.

/** Controller units or steps, by axis letter. */
export type ByLetter = Readonly<Record<string, number>>;

export type ReportLine =
  | { kind: 'ok' }
  /** A long command goes on; `paused`: it waits for a person. */
  | { kind: 'busy'; paused: boolean; text: string }
  | { kind: 'wait' }
  | { kind: 'start' }
  /** Refused, although an `ok` follows. */
  | { kind: 'unknown-command'; command: string }
  | { kind: 'resend'; number: number }
  /** Dead until a hardware reset. */
  | { kind: 'halted'; text: string }
  | { kind: 'complaint'; text: string }
  | { kind: 'position'; units: ByLetter; counts: ByLetter }
  /** Only the other family speaks like this. */
  | { kind: 'foreign'; text: string }
  | { kind: 'remark'; text: string };

const okForm = /^ok(?: N\d+)?(?: P\d+)?(?: B\d+)?$/;
const positionForm = /^((?:[A-Z]: ?-?\d+\.\d+ +)+)Count((?: +[A-Z]: ?-?\d+)+)\s*$/;
const foreignForm = /^(?:<.*>|error:\d+|ALARM:\d+|Grbl.*|\[[A-Z0-9]+:.*\])$/i;

export function readReportLine(text: string): ReportLine {
  if (okForm.test(text)) return { kind: 'ok' };
  if (text === 'start') return { kind: 'start' };
  if (text === 'wait') return { kind: 'wait' };
  const busy = /^echo: ?busy: ?(.+)$/.exec(text);
  if (busy) return { kind: 'busy', paused: busy[1]?.startsWith('paused') === true, text };
  const unknown = /^echo: ?Unknown command: "(.*)"$/.exec(text);
  if (unknown) return { kind: 'unknown-command', command: unknown[1] ?? '' };
  const resend = /^Resend: ?(\d+)$/.exec(text);
  if (resend) return { kind: 'resend', number: Number(resend[1]) };
  if (/^Error:.*(?:halted|kill\(\))/i.test(text)) return { kind: 'halted', text };
  const position = positionForm.exec(text);
  if (position)
    return { kind: 'position', units: byLetter(position[1] ?? ''), counts: byLetter(position[2] ?? '') };
  if (foreignForm.test(text)) return { kind: 'foreign', text };
  if (text.startsWith('Error:')) return { kind: 'complaint', text };
  return { kind: 'remark', text };
}

/** Complaints about the transport: what matters follows in a `Resend:` line. */
export function isTransportComplaint(text: string): boolean {
  return /line number|checksum/i.test(text);
}

/** `X100.00 Y100.00` or `X:1.00 Y:0.00` as numbers by letter. */
export function byLetter(text: string): ByLetter {
  return Object.fromEntries(
    [...text.matchAll(/([A-Z]):? ?(-?\d+(?:\.\d+)?)/g)].map((match) => [match[1] ?? '', Number(match[2])]),
  );
}

/** `N` line with its checksum: the exclusive or of every byte before the `*`. */
export function numberedLine(number: number, text: string): string {
  const body = `N${number} ${text}`;
  let sum = 0;
  for (const byte of new TextEncoder().encode(body)) sum ^= byte;
  return `${body}*${sum}`;
}
