// Tests that want a tool from outside (a browser, a reference library): run where it is there, skipped with
// one line where it is not. In the gate (CI is set) a missing tool is a failure.
import { it } from 'vitest';

/** `missing`: undefined where the tool is there, else one line that says what is not. */
export function itWithTool(missing: string | undefined): typeof it | typeof it.skip {
  if (missing === undefined) return it;
  if (process.env['CI']) {
    it('has the outside tool it wants', () => {
      throw new Error(missing);
    });
  } else {
    console.info(`skipped: ${missing}`);
  }
  return it.skip;
}
