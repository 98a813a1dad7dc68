// The progress bar of long work, with the time left as the run predicts it. On a terminal a bar; elsewhere
// (a log, a pipe) nothing, so that files stay readable.
import { Presets, SingleBar } from 'cli-progress';
import type { RunEvent } from '../run/events.ts';
import type { TextSink } from './surroundings.ts';
import { printable, renderDuration } from './terminal.ts';

export interface Progress {
  show(event: RunEvent): void;
  stop(): void;
}

export function progressOn(stderr: TextSink): Progress {
  const bar = stderr.isTTY ? makeBar(stderr) : undefined;
  const note = (text: string): void => {
    stderr.write(`${bar ? '\r\u001b[K' : ''}${printable(text)}\n`);
  };
  return {
    show(event) {
      switch (event.kind) {
        case 'started':
          bar?.start(event.steps, 0, { cut: '', left: renderDuration(event.expectedMs) });
          break;
        case 'sample': {
          const { cut, purpose } = event.sample;
          bar?.update(event.done, { cut: cut || purpose, left: renderDuration(event.leftMs) });
          break;
        }
        case 'retry':
          note(`${event.device}: ${event.text}; again in ${renderDuration(event.waitMs)}`);
          break;
        case 'recovered':
        case 'trouble':
          note(event.text);
          break;
        default:
      }
    },
    stop() {
      bar?.stop();
    },
  };
}

function makeBar(stderr: TextSink): SingleBar {
  return new SingleBar(
    {
      format: '{cut} {bar} {value}/{total}  left {left}',
      stream: stderr as unknown as NodeJS.WritableStream,
      barsize: 32,
      hideCursor: true,
    },
    Presets.rect,
  );
}
