// The page of this version: shows one figures file, chosen or dropped, without any server. Live runs come
// with the gateway.
import { effect, signal } from '@preact/signals';
import { type ComponentChild, h, render } from 'preact';
import { darkColours, lightColours } from '../plots/palette.ts';
import { type FiguresView, readFiguresFile } from './figures-file.ts';
import { firstIndex } from './frequency-choice.ts';
import { RunView } from './run-view.ts';
import './page.css';

const view = signal<FiguresView | undefined>(undefined);
const problem = signal('');
const frequencyIndex = signal(0);
const dragging = signal(false);
const dark = matchMedia('(prefers-color-scheme: dark)');
const colours = signal(dark.matches ? darkColours : lightColours);
dark.addEventListener('change', () => {
  colours.value = dark.matches ? darkColours : lightColours;
});

async function open(file: File | undefined): Promise<void> {
  if (!file) return;
  // A folder can be dropped, and a file can vanish between choosing and reading.
  const text = await file.text().catch(() => undefined);
  const read = text === undefined ? { problem: 'It could not be read.' } : readFiguresFile(text);
  if ('problem' in read) {
    problem.value = `${file.name}: ${read.problem}`;
    return;
  }
  problem.value = '';
  frequencyIndex.value = firstIndex(read);
  view.value = read;
}

// On the window, not on an element: a file dropped beside it would replace the page.
addEventListener('dragover', (event) => {
  event.preventDefault();
  dragging.value = true;
});
addEventListener('dragleave', (event) => {
  if (event.relatedTarget === null) dragging.value = false;
});
addEventListener('drop', (event) => {
  event.preventDefault();
  dragging.value = false;
  void open(event.dataTransfer?.files[0]);
});

effect(() => {
  const shown = view.value;
  document.title = shown ? `Run ${shown.run}: ${shown.title} – Nightcut` : 'Nightcut';
});

function Chooser(): ComponentChild {
  return h(
    'label',
    { class: 'chooser' },
    'Open a figures file ',
    h('input', {
      type: 'file',
      accept: '.json,application/json',
      // The same file, written again, is a new choice.
      onClick: (event: Event) => {
        (event.currentTarget as HTMLInputElement).value = '';
      },
      onChange: (event: Event) => open((event.currentTarget as HTMLInputElement).files?.[0]),
    }),
  );
}

function Empty(): ComponentChild {
  return h(
    'p',
    {},
    'Nothing open yet. Write a file with ',
    h('code', {}, 'nightcut show RUN --json --levels > run.json'),
    ' and open or drop it here.',
  );
}

function Page(): ComponentChild {
  const shown = view.value;
  return h(
    'div',
    { class: dragging.value ? 'page dragging' : 'page' },
    h('header', {}, h('h1', {}, 'Nightcut'), h(Chooser, {})),
    problem.value ? h('p', { class: 'problem', role: 'alert' }, problem.value) : null,
    shown
      ? h(RunView, {
          shown,
          frequencyIndex: frequencyIndex.value,
          colours: colours.value,
          choose: (index) => {
            frequencyIndex.value = index;
          },
        })
      : h(Empty, {}),
  );
}

render(h(Page, {}), document.getElementById('page')!);
