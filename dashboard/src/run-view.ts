// One run on the page: what it is, its flags, the frequency to look at, and for it the pattern and the match.
import { type ComponentChild, h } from 'preact';
import { levelOverFrequencyOption } from '../plots/level-over-frequency.ts';
import type { PlotColours } from '../plots/palette.ts';
import { polarPatternOption } from '../plots/polar-pattern.ts';
import { cutFigureRows, matchRows } from './figure-rows.ts';
import { FigureTable } from './figure-table.ts';
import type { CutView, FiguresView, MatchView } from './figures-file.ts';
import { FrequencyChoice } from './frequency-choice.ts';
import { Plot } from './plot.ts';

/** How far below the peak the polar plot reaches. Common practice, no source. */
const polarRangeDb = 40;

export interface RunViewProps {
  shown: FiguresView;
  frequencyIndex: number;
  colours: PlotColours;
  choose: (frequencyIndex: number) => void;
}

export function RunView(props: RunViewProps): ComponentChild {
  const { shown, frequencyIndex, choose } = props;
  return h(
    'article',
    {},
    h('h2', {}, `Run ${shown.run}: ${shown.title}`),
    h('p', {}, [shown.state, shown.gainFrom].filter(Boolean).join(' · ')),
    h(Flags, { flags: shown.flags }),
    h(FrequencyChoice, { shown, frequencyIndex, choose }),
    h(
      'div',
      { class: 'parts' },
      shown.cuts.length > 0 ? h(Pattern, props) : null,
      shown.match ? h(Match, { ...props, match: shown.match }) : null,
    ),
  );
}

function Flags({ flags }: { flags: readonly string[] }): ComponentChild {
  if (flags.length === 0) return h('p', {}, 'no flags');
  return h('ul', { class: 'flags', 'aria-label': 'flags' }, ...flags.map((flag) => h('li', {}, flag)));
}

function Pattern({ shown, frequencyIndex, colours }: RunViewProps): ComponentChild {
  const curves = shown.cuts
    .filter((cut) => cut.levelDb.length > 0)
    .map(({ name, anglesDeg, levelDb }) => ({ name, anglesDeg, levelDb: levelDb[frequencyIndex] ?? [] }));
  const option = polarPatternOption(curves, polarRangeDb, colours);
  return h(
    'section',
    { class: 'pattern' },
    h('h3', {}, 'Pattern'),
    h(
      'div',
      { class: 'pair' },
      h(
        'figure',
        {},
        h(Plot, { option, label: `polar pattern of ${curves.map(({ name }) => name).join(', ')}` }),
        h('figcaption', {}, 'dB relative to the highest level shown'),
      ),
      h(FigureTable, {
        heads: shown.cuts.map((cut): [string, string] => [cut.name, planeInWords(cut)]),
        figures: cutFigureRows(shown.cuts, frequencyIndex),
      }),
    ),
  );
}

function planeInWords({ plane }: CutView): string {
  return plane === 'E' || plane === 'H' ? `${plane}-plane` : '';
}

function Match(props: RunViewProps & { match: MatchView }): ComponentChild {
  const { shown, match, frequencyIndex, colours } = props;
  const option = levelOverFrequencyOption(
    {
      name: 'return loss',
      frequenciesHz: shown.frequenciesHz,
      levelDb: match.returnLossDb.map((entry) => entry.value),
      markersHz: shown.markersHz,
      shownIndex: frequencyIndex,
    },
    colours,
  );
  return h(
    'section',
    { class: 'match' },
    h('h3', {}, 'Match'),
    h(
      'div',
      { class: 'pair' },
      h('figure', {}, h(Plot, { option, label: 'return loss over frequency' })),
      h(FigureTable, { heads: [], figures: matchRows(match, frequencyIndex) }),
    ),
  );
}
