// A YAML tree through a zod schema and then through the checks between fields, with every refusal turned
// into a problem with its line. Used by both loaders; knows neither file.
import { z } from 'zod';
import { type FilePath, type FileProblem, fileInvalid, pathText, shown } from './file-problems.ts';
import { nearestWord } from './nearest-word.ts';
import { parseYaml, type YamlTree } from './yaml-tree.ts';

/** A refusal of a check between fields. */
export interface Finding {
  path: FilePath;
  /** Follows `expected`; `; found …` is added. */
  expectation: string;
  advice?: string;
}

/** Beyond so many unknown keys in one mapping only their number is told. */
const unknownKeysTold = 20;

/** Text to checked values; throws FILE_INVALID with the lines of everything that is wrong. */
export function checkText<Schema extends z.ZodType>(
  text: string,
  file: string,
  schema: Schema,
  checkBetween: (checked: z.output<Schema>) => Finding[],
): z.output<Schema> {
  const tree = parseYaml(text, file);
  const outcome = schema.safeParse(tree.value);
  if (!outcome.success) {
    throw fileInvalid(file, schemaProblems(outcome.error.issues, tree, schema));
  }
  const problems = checkBetween(outcome.data).map((finding) => findingProblem(finding, tree));
  if (problems.length > 0) throw fileInvalid(file, problems);
  return outcome.data;
}

/** A mistyped key is also a missing one: told once, as mistyped. */
function schemaProblems(issues: z.core.$ZodIssue[], tree: YamlTree, schema: z.core.$ZodType): FileProblem[] {
  const meant = new Set<string>();
  const unknown = issues.flatMap((issue) =>
    issue.code === 'unrecognized_keys' ? unknownKeys(issue.keys, pathOf(issue), tree, schema, meant) : [],
  );
  const others = issues
    .filter((issue) => issue.code !== 'unrecognized_keys')
    .filter((issue) => !meant.has(pathText(pathOf(issue))) || tree.found(pathOf(issue)) !== 'nothing')
    .map((issue) => issueProblem(issue, tree));
  return [...unknown, ...others];
}

function pathOf(issue: z.core.$ZodIssue): FilePath {
  return issue.path.map((part) => (typeof part === 'number' ? part : String(part)));
}

function findingProblem(finding: Finding, tree: YamlTree): FileProblem {
  const { path, expectation, advice } = finding;
  const hint = advice === undefined ? '' : ` (${advice})`;
  const text = `expected ${expectation}; found ${tree.found(path)}${hint}`;
  return { line: tree.lineOf(path), path, text };
}

function issueProblem(issue: z.core.$ZodIssue, tree: YamlTree): FileProblem {
  const path = pathOf(issue);
  if (issue.code === 'invalid_key') {
    const expected = issue.issues[0]?.message ?? 'another key';
    return { line: tree.lineOf(path, 'key'), path, text: `expected ${expected}` };
  }
  const advice = issue.code === 'custom' ? issue.params?.['advice'] : undefined;
  const finding: Finding = { path, expectation: issue.message };
  if (typeof advice === 'string') finding.advice = advice;
  return findingProblem(finding, tree);
}

/** Adds the paths of the keys that were probably meant to `meant`. */
function unknownKeys(
  written: readonly string[],
  path: FilePath,
  tree: YamlTree,
  schema: z.core.$ZodType,
  meant: Set<string>,
): FileProblem[] {
  const known = knownKeys(schema, path);
  return written.map((key, i) => {
    if (i >= unknownKeysTold) return { line: tree.lineOf(path, 'key'), path, text: 'one more unknown key' };
    const near = nearestWord(key, known);
    if (near !== undefined) meant.add(pathText([...path, near]));
    const hint = near === undefined ? `known here: ${known.join(', ')}` : `did you mean \`${near}\`?`;
    const line = tree.lineOf([...path, key], 'key');
    return { line, path, text: `unknown key \`${shown(key, 40)}\`; ${hint}` };
  });
}

/** The keys a schema allows at a path. */
function knownKeys(schema: z.core.$ZodType, path: FilePath): string[] {
  let at = unwrapped(schema);
  for (const part of path) {
    if (at instanceof z.ZodObject) at = unwrapped(at.shape[part] as z.core.$ZodType);
    else if (at instanceof z.ZodArray) at = unwrapped(at.element);
    else if (at instanceof z.ZodRecord) at = unwrapped(at.valueType);
  }
  return at instanceof z.ZodObject ? Object.keys(at.shape) : [];
}

function unwrapped(schema: z.core.$ZodType): z.core.$ZodType {
  let at = schema;
  for (;;) {
    if (at instanceof z.ZodOptional || at instanceof z.ZodPrefault || at instanceof z.ZodDefault)
      at = at.unwrap();
    else if (at instanceof z.ZodPipe && at.in instanceof z.ZodTransform) at = at.out;
    else return at;
  }
}
