// What is due when: acts ordered by their moment, ties by order of registration. The clocks differ only in
// how they wait for the earliest; none may let a later act overtake an earlier one.

interface Due {
  dueMs: number;
  order: number;
  act: (() => void) | undefined;
}

export class DueQueue {
  readonly #heap: Due[] = [];
  #order = 0;

  /** Returns how to take the act back. */
  push(dueMs: number, act: () => void): () => void {
    const due: Due = { dueMs, order: this.#order++, act };
    this.#rise(due);
    return () => {
      due.act = undefined;
    };
  }

  /** The moment of the earliest act; undefined when nothing waits. */
  get earliestMs(): number | undefined {
    this.#dropCancelled();
    return this.#heap[0]?.dueMs;
  }

  /** Takes the earliest act that is due by `nowMs`; undefined when there is none. */
  takeDue(nowMs: number): (() => void) | undefined {
    this.#dropCancelled();
    const first = this.#heap[0];
    return first && first.dueMs <= nowMs ? this.#pop()?.act : undefined;
  }

  #dropCancelled(): void {
    while (this.#heap[0] && !this.#heap[0].act) this.#pop();
  }

  #rise(due: Due): void {
    const heap = this.#heap;
    let at = heap.push(due) - 1;
    while (at > 0) {
      const parent = (at - 1) >> 1;
      if (!before(due, heap[parent]!)) break;
      heap[at] = heap[parent]!;
      at = parent;
    }
    heap[at] = due;
  }

  #pop(): Due | undefined {
    const heap = this.#heap;
    const top = heap[0];
    const last = heap.pop();
    if (!top || !last || heap.length === 0) return top;
    let at = 0;
    for (;;) {
      let child = 2 * at + 1;
      if (child >= heap.length) break;
      if (child + 1 < heap.length && before(heap[child + 1]!, heap[child]!)) child += 1;
      if (!before(heap[child]!, last)) break;
      heap[at] = heap[child]!;
      at = child;
    }
    heap[at] = last;
    return top;
  }
}

function before(a: Due, b: Due): boolean {
  return a.dueMs < b.dueMs || (a.dueMs === b.dueMs && a.order < b.order);
}
