// The known word that a mistyped one was probably meant to be. For messages only, never to decide.

/** Nearest of `known` by letters inserted, left out, replaced or swapped; undefined when none is near. */
export function nearestWord(written: string, known: readonly string[]): string | undefined {
  if (written.length > 60) return undefined;
  const near = known
    .map((word) => ({ word, slips: slipsBetween(written.toLowerCase(), word.toLowerCase()) }))
    .filter(({ word, slips }) => slips <= Math.max(1, Math.floor(word.length / 3)))
    .sort((a, b) => a.slips - b.slips);
  return near[0]?.word;
}

/** Edit distance with swaps of neighbours (restricted Damerau-Levenshtein). */
function slipsBetween(a: string, b: string): number {
  let beforeLast: number[] = [];
  let last = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i += 1) {
    const row = [i];
    for (let j = 1; j <= b.length; j += 1) {
      const replaced = last[j - 1]! + (a[i - 1] === b[j - 1] ? 0 : 1);
      let least = Math.min(replaced, last[j]! + 1, row[j - 1]! + 1);
      const swapped = i > 1 && j > 1 && a[i - 1] === b[j - 2] && a[i - 2] === b[j - 1];
      if (swapped) least = Math.min(least, beforeLast[j - 2]! + 1);
      row.push(least);
    }
    beforeLast = last;
    last = row;
  }
  return last[b.length]!;
}
