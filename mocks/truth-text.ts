// Truth as JSON: a figure without an end (the return loss of a perfect match) has no number in JSON and is
// written as absent, with the reason.

export function truthText(value: object, indent?: number): string {
  return JSON.stringify(
    value,
    (_, entry: unknown) =>
      typeof entry === 'number' && !Number.isFinite(entry)
        ? { kind: 'absent', because: 'it has no finite value' }
        : entry,
    indent,
  );
}
