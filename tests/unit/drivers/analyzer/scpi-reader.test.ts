import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type Expected, type ReaderNews, ScpiReader } from '../../../../drivers/analyzer/scpi-reader.ts';

const text: Expected = { kind: 'text', maxBytes: 1000 };
const block: Expected = { kind: 'block', maxBytes: 1000 };

function bytesOf(latin1: string): Uint8Array {
  return Buffer.from(latin1, 'latin1');
}

/** Cuts at the given places, which may repeat (empty pieces) and lie beyond the end. */
function cutAt(bytes: Uint8Array, places: readonly number[]): Uint8Array[] {
  const sorted = [...places].sort((a, b) => a - b);
  return [...sorted, bytes.length].map((end, i) => bytes.subarray(i === 0 ? 0 : sorted[i - 1], end));
}

/** Reads one answer after another, a new reader for each, as the session does. */
function readAll(pieces: readonly Uint8Array[], questions: readonly Expected[]): ReaderNews[] {
  const answers: ReaderNews[] = [];
  let reader = new ScpiReader(questions[0]!);
  for (const piece of pieces) {
    let rest = piece;
    while (rest.length > 0 && answers.length < questions.length) {
      const news = reader.take(rest);
      if (news.kind === 'more') break;
      answers.push(news);
      if (news.kind === 'unreadable' || answers.length === questions.length) break;
      reader = new ScpiReader(questions[answers.length]!);
      rest = news.rest;
    }
  }
  return answers;
}

function contents(news: ReaderNews): unknown {
  if (news.kind === 'text') return news.text;
  return news.kind === 'block' ? Array.from(news.data) : news;
}

const lineEnd = fc.constantFrom('\n', '\r\n');
const answer = fc.oneof(
  fc.record({
    kind: fc.constant('text' as const),
    value: fc.stringMatching(/^[A-Z0-9+.,"-]{1,40}$/),
    end: lineEnd,
  }),
  fc.record({
    kind: fc.constant('block' as const),
    value: fc.uint8Array({ maxLength: 300 }),
    end: fc.constantFrom('\n', '\r\n', ''),
  }),
);

describe('reading answers', () => {
  it('gives the same answers however the bytes are cut, line feeds in blocks included', () => {
    fc.assert(
      fc.property(
        fc.array(answer, { minLength: 1, maxLength: 6 }),
        fc.array(fc.nat({ max: 1500 }), { maxLength: 40 }),
        (answers, places) => {
          const wire = Buffer.concat(
            answers.map(({ kind, value, end }) => {
              const body = kind === 'text' ? Buffer.from(value as string) : Buffer.from(value as Uint8Array);
              const length = String(body.length);
              const head = kind === 'text' ? '' : `#${length.length}${length}`;
              return Buffer.concat([Buffer.from(head), body, Buffer.from(end)]);
            }),
          );
          const questions = answers.map(({ kind }) => (kind === 'text' ? text : block));
          const expected = answers.map(({ value }) =>
            typeof value === 'string' ? value : Array.from(value),
          );
          const bounded = places.map((place) => Math.min(place, wire.length));
          expect(readAll(cutAt(wire, bounded), questions).map(contents)).toEqual(expected);
        },
      ),
      { numRuns: 400 },
    );
  });

  it('reads byte by byte', () => {
    const wire = bytesOf('1000\r\n#13\n\r\n\r\n+1\n');
    const pieces = Array.from(wire, (byte) => Uint8Array.of(byte));
    expect(readAll(pieces, [text, block, text]).map(contents)).toEqual(['1000', [10, 13, 10], '+1']);
  });

  it('keeps a block with leading zeros in its length and an empty block', () => {
    expect(readAll([bytesOf('#3004abcd\n#10\n')], [block, block]).map(contents)).toEqual([
      [97, 98, 99, 100],
      [],
    ]);
  });

  it('hands back what follows the answer', () => {
    const news = new ScpiReader(text).take(bytesOf('1\r\nEXAMPLE'));
    expect(news.kind === 'text' && Buffer.from(news.rest).toString()).toBe('EXAMPLE');
  });

  it('strips carriage returns at the end only, and keeps every byte beyond ASCII', () => {
    expect(readAll([bytesOf('a\rb\xae\r\r\n')], [text]).map(contents)).toEqual(['a\rb\xae']);
  });
});

describe('what cannot be read', () => {
  const refused = (wire: string, expected: Expected): ReaderNews =>
    new ScpiReader(expected).take(bytesOf(wire));

  it('refuses an indefinite block and says what to do', () => {
    const news = refused('#0abc', block);
    expect(news).toMatchObject({ kind: 'unreadable', code: 'ANALYZER_BAD_BLOCK' });
    expect(news.kind === 'unreadable' && news.because).toContain('another trace format');
  });

  it('refuses a length above the cap before any data came', () => {
    expect(refused('#9999999999', block)).toMatchObject({ kind: 'unreadable', code: 'ANALYZER_BAD_BLOCK' });
    expect(refused('#41001', block)).toMatchObject({ kind: 'unreadable' });
    expect(refused('#41000', block)).toEqual({ kind: 'more' });
  });

  it.each(['#x12', '#21x', '# 12', '-113,"Undefined"', '+1.0,+2.0'])('refuses %s as a block', (wire) => {
    expect(refused(wire, block)).toMatchObject({ kind: 'unreadable', code: 'ANALYZER_BAD_BLOCK' });
  });

  it('shows the first bytes', () => {
    expect(refused('1,2\n', block)).toMatchObject({ firstBytesHex: '31 2c 32 0a' });
  });

  it('refuses a block where a text was asked for, but reads hexadecimal numbers', () => {
    expect(refused('#216abc', text)).toMatchObject({ kind: 'unreadable', code: 'ANALYZER_BAD_ANSWER' });
    expect(readAll([bytesOf('#'), bytesOf('216')], [text])).toMatchObject([{ kind: 'unreadable' }]);
    expect(readAll([bytesOf('#H1F\n')], [text]).map(contents)).toEqual(['#H1F']);
  });

  it('refuses a line that never ends', () => {
    const reader = new ScpiReader({ kind: 'text', maxBytes: 10 });
    expect(reader.take(bytesOf('0123456789'))).toEqual({ kind: 'more' });
    expect(reader.take(bytesOf('0'))).toMatchObject({ kind: 'unreadable', code: 'ANALYZER_BAD_ANSWER' });
  });
});
