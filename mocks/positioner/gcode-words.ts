// One line of G-code to letters and numbers, the simulated controller's own way of reading: spaces, comments
// and the block-delete sign fall out, case does not matter, only eight digits of a number count. Says nothing
// about what the words mean.

export interface Word {
  letter: string;
  value: number;
}

export type Refusal = { error: number };

/** The line as the controller keeps it: no spaces, no comments, upper case. */
export function condensed(line: string): string {
  let kept = '';
  let inBrackets = false;
  for (const character of line) {
    if (inBrackets) {
      if (character === ')') inBrackets = false;
    } else if (character === '(') inBrackets = true;
    else if (character === ';') break;
    else if (character > ' ' && character !== '/') kept += character;
  }
  return kept.toUpperCase();
}

/** Reads a number at `at`; undefined when there is none. Digits past the eighth are passed over. */
export function readNumber(text: string, at: number): { value: number; next: number } | undefined {
  let next = at;
  let sign = 1;
  if (text[next] === '-') sign = -1;
  if (text[next] === '-' || text[next] === '+') next += 1;
  let mantissa = 0;
  let exponent = 0;
  let digits = 0;
  let afterPoint = false;
  for (; next < text.length; next += 1) {
    const character = text[next]!;
    if (character === '.' && !afterPoint) afterPoint = true;
    else if (character >= '0' && character <= '9') {
      digits += 1;
      if (digits <= 8) {
        mantissa = mantissa * 10 + Number(character);
        if (afterPoint) exponent -= 1;
      } else if (!afterPoint) exponent += 1;
    } else break;
  }
  if (digits === 0) return undefined;
  return { value: (sign * mantissa) / 10 ** -exponent, next };
}

/** Splits a condensed line into words: error 1 where a letter is missing, 2 where a number is. */
export function wordsOf(line: string): Word[] | Refusal {
  const words: Word[] = [];
  let at = 0;
  while (at < line.length) {
    const letter = line[at]!;
    if (letter < 'A' || letter > 'Z') return { error: 1 };
    const number = readNumber(line, at + 1);
    if (!number) return { error: 2 };
    words.push({ letter, value: number.value });
    at = number.next;
  }
  return words;
}
