// The built page in a real browser, with the figures of a simulated run: what it shows is what the document
// holds, at every size and in both colour schemes, by mouse and by keyboard, and nothing leaves the machine.
import { mkdir, readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import type { Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, describe, expect } from 'vitest';
import type { FigureEntry, FiguresDocument } from '../../daemon/results/figures-document.ts';
import { runFigures } from '../../daemon/results/run-figures.ts';
import { itWithTool } from '../support/outside-tool.ts';
import { patternPlan, referencePlan, SimulatedRange } from '../support/simulated-range.ts';
import { missingBrowser, type OpenPage, PageBench, type PageOptions } from './open-page.ts';
import { drawnCurve, type ShownCell, shownRows, straightLine } from './shown-figures.ts';

const it = itWithTool(missingBrowser);

/** The words of the README for the keys of the document. */
const words: Readonly<Record<string, string>> = {
  realizedGainDbi: 'realized gain',
  gainDbi: 'gain',
  peakDeg: 'peak at',
  halfPowerBeamwidthDeg: 'half-power beamwidth',
  tenDbBeamwidthDeg: '−10 dB beamwidth',
  firstNullBeamwidthDeg: 'first-null beamwidth',
  squintDeg: 'squint',
  frontToBackDb: 'front-to-back',
  frontToRearDb: 'front-to-rear',
  firstSideLobeLeftDb: 'first side lobe left',
  firstSideLobeRightDb: 'first side lobe right',
  sideLobeLevelDb: 'side lobe level',
  circularityDb: 'circularity',
  closureDb: 'closure',
  driftDb: 'drift',
};
/** Colours of the first and second curve, in light and dark alike. */
const curveColours = ['#c2571a', '#2a7f8e'] as const;

let bench: PageBench;
let document: FiguresDocument;
let file: string;
const opened: OpenPage[] = [];

/** A full turn, and a part of one whose opposite direction is therefore absent; drift enough for a flag. */
async function measuredDocument(): Promise<FiguresDocument> {
  const range = new SimulatedRange({
    bench: { scene: { seed: 3, rangeLengthM: 6, drift: { dbPerHour: 20, degPerHour: 5, walkDb: 0 } } },
  });
  try {
    range.bench.mount('reference');
    await range.measure(referencePlan);
    range.bench.mount('aut');
    const plan = patternPlan(['azimuth', 'elevation'], { stepDeg: 5 }).replace(
      'plane: E, from: -180 deg, to: 180 deg',
      'plane: E, from: -90 deg, to: 90 deg',
    );
    const { run } = await range.measure(plan);
    return await runFigures(range.archive, run.number, { levels: true });
  } finally {
    await range.close();
  }
}

async function open(options: PageOptions = {}): Promise<OpenPage> {
  const page = await bench.open(options);
  opened.push(page);
  return page;
}

async function openedRun(options: PageOptions = {}): Promise<Page> {
  const { page } = await open(options);
  await page.setInputFiles('input[type=file]', file);
  await page.locator('section.match .plot svg path').first().waitFor({ state: 'attached' });
  return page;
}

/** The document as a file that was dropped on the window, beside everything that stands on the page. */
async function drop(page: Page, name: string, text: string): Promise<void> {
  await page.evaluate(`(() => {
    const dataTransfer = new DataTransfer();
    dataTransfer.items.add(new File([${JSON.stringify(text)}], ${JSON.stringify(name)}));
    const kept = dispatchEvent(new DragEvent('drop', { dataTransfer, bubbles: true, cancelable: true }));
    if (kept) throw new Error('the browser would leave the page for the file');
  })()`);
}

/** Half a digit in the last place shown. */
function expectShown(cell: ShownCell | undefined, entry: FigureEntry | undefined, scale = 1): void {
  if (!entry || 'absent' in entry) {
    expect(cell).toEqual({ text: '–', note: entry?.absent });
    return;
  }
  expect(cell?.note).toBe(entry.note);
  const [, sign, number, decimals] = /^(≤ |≥ |)(−?\d+(?:\.(\d+))?)$/.exec(cell?.text ?? '') ?? [];
  expect(sign, cell?.text).toBe(entry.bound === 'upper' ? '≤ ' : entry.bound === 'lower' ? '≥ ' : '');
  const shown = Number(number?.replace('−', '-'));
  expect(Math.abs(shown - entry.value / scale)).toBeLessThanOrEqual(
    0.5 * 10 ** -(decimals ?? '').length + 1e-9,
  );
}

async function expectFiguresOf(page: Page, index: number): Promise<void> {
  const pattern = await shownRows(page, 'pattern');
  for (const [column, cut] of document.cuts.entries()) {
    for (const [key, entries] of Object.entries(cut.figures)) {
      expectShown(pattern.get(words[key]!)?.[column], entries[index]);
    }
  }
  const match = await shownRows(page, 'match');
  expectShown(match.get('VSWR')?.[0], document.match?.vswr[index]);
  expectShown(match.get('return loss')?.[0], document.match?.returnLossDb[index]);
  expectShown(match.get('best match')?.[0], document.match?.bestMatchHz, 1e6);
  expectShown(match.get('resonance')?.[0], document.match?.resonanceHz, 1e6);
  expectShown(match.get('length scale')?.[0], document.match?.lengthScale);
}

/** The curves lie where the levels are: angle clockwise from the top, 40 dB from the rim to the centre. */
async function expectCurvesOf(page: Page, index: number): Promise<void> {
  const highestDb = Math.max(...document.cuts.flatMap((cut) => cut.levelDb?.[index] ?? []));
  for (const [column, cut] of document.cuts.entries()) {
    const points = await drawnCurve(page, 'pattern', curveColours[column]!);
    const isTurn = cut.name === 'azimuth';
    expect(points).toHaveLength(cut.anglesDeg.length + (isTurn ? 1 : 0));
    const radii = cut.levelDb![index]!.map((level) => Math.max(0, (level - highestDb + 40) / 40));
    const across = cut.anglesDeg.map((deg, k) => radii[k]! * Math.sin((deg * Math.PI) / 180));
    const upwards = cut.anglesDeg.map((deg, k) => radii[k]! * Math.cos((deg * Math.PI) / 180));
    const x = straightLine(
      across,
      points.slice(0, across.length).map((point) => point.x),
    );
    const y = straightLine(
      upwards,
      points.slice(0, upwards.length).map((point) => point.y),
    );
    // A pixel is the finest that is drawn; the radius is one, and large enough to read.
    expect(Math.max(x.worst, y.worst)).toBeLessThan(1);
    expect(x.slope).toBeGreaterThan(80);
    expect(Math.abs(x.slope + y.slope)).toBeLessThan(1);
  }
}

/** Chosen by the keyboard: as many steps right from the first frequency. */
async function slideTo(page: Page, index: number): Promise<void> {
  await page.getByRole('slider', { name: 'frequency' }).focus();
  await page.keyboard.press('Home');
  for (let step = 0; step < index; step += 1) await page.keyboard.press('ArrowRight');
  // The plots follow one frame after the figures.
  for (let frame = 0; frame < 2; frame += 1) {
    await page.evaluate('new Promise((done) => requestAnimationFrame(() => setTimeout(done)))');
  }
}

describe('the built page', () => {
  beforeAll(async () => {
    [bench, document] = await Promise.all([PageBench.start(), measuredDocument()]);
    file = join(bench.folder, 'run.json');
    await writeFile(file, JSON.stringify(document));
  }, 120_000);

  afterAll(async () => {
    await bench?.close();
  });

  // Of every test: no complaint in the console, no request off the server.
  afterEach(async () => {
    for (const { page, complaints, requested } of opened.splice(0)) {
      await page.context().close();
      expect(complaints).toEqual([]);
      expect(requested.length).toBeGreaterThan(1);
      expect(requested.filter((url) => !url.startsWith(bench.url) && url !== 'data:,')).toEqual([]);
    }
  });

  it('is handed a run that has what there is to show', () => {
    expect(document.state).toBe('complete');
    expect(Object.keys(document.cuts[0]?.figures ?? {}).sort()).toEqual(Object.keys(words).sort());
    expect(document.cuts[1]?.figures.frontToBackDb?.[0]).toHaveProperty('absent');
    expect(document.flags.map((flag) => flag.code)).toContain('DRIFT_LARGE');
  });

  it('shows a chosen file: the run, its flags, its figures at the marker, its curves', async () => {
    const page = await openedRun();
    const text = await page.locator('main').textContent();
    expect(text).toContain('Run 2: river-gauge yagi C');
    expect(text).toContain('complete · gain from run 1 (half-wave dipole)');
    for (const flag of document.flags) expect(text).toContain(flag.text);
    expect(await page.title()).toBe('Run 2: river-gauge yagi C – Nightcut');
    const marker = document.frequenciesHz.indexOf(868e6);
    expect(await page.locator('output').textContent()).toBe('868.00 MHz');
    await expectFiguresOf(page, marker);
    await expectCurvesOf(page, marker);
  });

  it('draws the return loss over the band', async () => {
    const page = await openedRun();
    const points = await drawnCurve(page, 'match', curveColours[0]);
    const losses = document.match!.returnLossDb.map((entry) => ('value' in entry ? entry.value : Number.NaN));
    expect(points).toHaveLength(losses.length);
    const x = straightLine(
      document.frequenciesHz,
      points.map((point) => point.x),
    );
    const y = straightLine(
      losses,
      points.map((point) => point.y),
    );
    expect(Math.max(x.worst, y.worst)).toBeLessThan(1);
    expect(x.slope).toBeGreaterThan(0);
    expect(y.slope).toBeLessThan(0);
  });

  it('shows a dropped file', async () => {
    const { page } = await open();
    expect(await page.locator('main').textContent()).toContain(
      'nightcut show RUN --json --levels > run.json',
    );
    await drop(page, 'dropped.json', JSON.stringify(document));
    await page.locator('section.pattern .plot svg path').first().waitFor({ state: 'attached' });
    await expectFiguresOf(page, document.frequenciesHz.indexOf(868e6));
  });

  it('follows the frequency slider', async () => {
    const page = await openedRun();
    for (const index of [0, 7]) {
      await slideTo(page, index);
      await expectFiguresOf(page, index);
      await expectCurvesOf(page, index);
    }
    await page.keyboard.press('End');
    const last = document.frequenciesHz.length - 1;
    await expectFiguresOf(page, last);
    expect(await page.locator('output').textContent()).toBe('920.00 MHz');
    expect(await page.getByRole('slider').getAttribute('aria-valuetext')).toBe('920.00 MHz');
  });

  it('says in an alert what is wrong with a file, and keeps the run that is open', async () => {
    const page = await openedRun();
    const alert = page.getByRole('alert');
    const damaged = structuredClone(document);
    damaged.cuts[1]!.levelDb![3]!.pop();
    const withoutLevels = { ...document, cuts: document.cuts.map(({ levelDb, ...cut }) => cut) };
    const wrong: [name: string, text: string, says: string][] = [
      [
        'photo.json',
        'no JSON at all',
        'photo.json: This is no JSON file. Write one with: nightcut show RUN --json --levels',
      ],
      ['null.json', 'null', 'null.json: This file holds no figures/1 document.'],
      ['other.json', '{"nightcut":"figures/2"}', 'other.json: This file holds no figures/1 document.'],
      ['plain.json', JSON.stringify(withoutLevels), 'plain.json: The file holds figures without levels.'],
      ['cut.json', JSON.stringify(damaged), 'cut.json: The levels of the cut elevation do not fit'],
    ];
    for (const [name, text, says] of wrong) {
      await page.setInputFiles('input[type=file]', {
        name,
        mimeType: 'application/json',
        buffer: Buffer.from(text),
      });
      await alert.filter({ hasText: name }).waitFor();
      expect(await alert.textContent()).toContain(says);
    }
    await expectFiguresOf(page, document.frequenciesHz.indexOf(868e6));
    await page.setInputFiles('input[type=file]', file);
    await alert.waitFor({ state: 'detached' });
  });

  it('is worked by the keyboard alone', async () => {
    const { page } = await open();
    await page.locator('input[type="file"]').waitFor();
    await page.bringToFront();
    await page.keyboard.press('Tab');
    expect(await page.evaluate('document.activeElement.type')).toBe('file');
    const [chooser] = await Promise.all([page.waitForEvent('filechooser'), page.keyboard.press('Enter')]);
    await chooser.setFiles(file);
    await page.locator('section.pattern').waitFor();
    const focused = () => page.evaluate<string>('document.activeElement.outerHTML.slice(0, 120)');
    await page.keyboard.press('Tab');
    expect(await focused()).toContain('type="range"');
    expect(await page.evaluate('getComputedStyle(document.activeElement).outlineStyle')).toBe('solid');
    await page.keyboard.press('End');
    expect(await page.locator('output').textContent()).toBe('920.00 MHz');
    await page.keyboard.press('Tab');
    expect(await focused()).toContain('868 MHz');
    await page.keyboard.press('Enter');
    expect(await page.locator('output').textContent()).toBe('868.00 MHz');
  });

  for (const width of [360, 1920]) {
    for (const colorScheme of ['light', 'dark'] as const) {
      it(`fits ${width} px in ${colorScheme} colours`, async () => {
        const page = await openedRun({ width, height: width === 360 ? 740 : 1080, colorScheme });
        const folder = process.env['NIGHTCUT_SCREENSHOTS'] ?? join(bench.folder, 'screenshots');
        await mkdir(folder, { recursive: true });
        const path = join(folder, `${width}-${colorScheme}.png`);
        await page.screenshot({ path, fullPage: true });
        // Width of a PNG: bytes 16 to 19 (PNG specification, IHDR).
        expect((await readFile(path)).readUInt32BE(16)).toBe(width);
        expect(await page.evaluate('document.documentElement.scrollWidth')).toBe(width);
        expect(await page.evaluate(cutOffTexts)).toEqual([]);
        expect(await page.evaluate(`matchMedia('(prefers-color-scheme: ${colorScheme})').matches`)).toBe(
          true,
        );
        const contrasts = await page.evaluate<[name: string, ratio: number][]>(textContrasts);
        expect(contrasts.length).toBeGreaterThan(4);
        for (const [name, ratio] of contrasts) expect(ratio, name).toBeGreaterThanOrEqual(4.5);
        const ground = await page.evaluate<string>('getComputedStyle(document.body).backgroundColor');
        const brightness = Number(/\d+/.exec(ground)?.[0]);
        expect(colorScheme === 'light' ? brightness > 200 : brightness < 60, ground).toBe(true);
      });
    }
  }
});

/** Labels of the plots that reach out of their plot, or table cells out of their table's box. */
const cutOffTexts = `(() => {
  const within = (box, around) => box.left >= around.left - 1 && box.right <= around.right + 1 &&
    box.top >= around.top - 1 && box.bottom <= around.bottom + 1;
  return [...document.querySelectorAll('.plot text, .figures td, .figures th')]
    .filter((text) => text.textContent !== '')
    .filter((text) => !within(text.getBoundingClientRect(), text.closest('.plot, .figures').getBoundingClientRect()))
    .map((text) => text.textContent);
})()`;

/** Contrast of every kind of text with the ground: WCAG 2.1, relative luminance; 4.5 is its level AA. */
const textContrasts = `(() => {
  const luminance = (colour) => colour.match(/[\\d.]+/g).slice(0, 3)
    .map((value) => value / 255)
    .map((value) => (value <= 0.03928 ? value / 12.92 : ((value + 0.055) / 1.055) ** 2.4))
    .reduce((sum, value, k) => sum + value * [0.2126, 0.7152, 0.0722][k], 0);
  const ground = luminance(getComputedStyle(document.body).backgroundColor);
  const kinds = ['h1', 'article p', '.flags li', 'thead th', 'tbody td', 'sup', '.notes li', 'figcaption', '.plot text'];
  return kinds.map((kind) => {
    const element = document.querySelector(kind);
    const { color, fill } = getComputedStyle(element);
    const text = luminance(kind === '.plot text' ? fill : color);
    return [kind, (Math.max(text, ground) + 0.05) / (Math.min(text, ground) + 0.05)];
  });
})()`;
