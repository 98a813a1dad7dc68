// The order of whole operations (prepare, acquire, …): one at a time, in the order asked for, and one way
// past them all for what cannot wait. Knows nothing of instruments.

interface Operation {
  begin: () => Promise<void>;
  reject: (reason: unknown) => void;
}

export class OperationQueue {
  readonly #waiting: Operation[] = [];
  #current: AbortController | undefined;

  get isBusy(): boolean {
    return this.#current !== undefined;
  }

  /**
   * Runs `work` when its turn comes. `stop` is aborted with the caller's signal or by `interrupt`; work
   * must come to an end then.
   */
  run<T>(work: (stop: AbortSignal) => Promise<T>, signal?: AbortSignal): Promise<T> {
    return new Promise<T>((resolve, reject) => {
      const begin = async (): Promise<void> => {
        const controller = new AbortController();
        this.#current = controller;
        const onAbort = (): void => controller.abort(signal?.reason);
        if (signal?.aborted) onAbort();
        signal?.addEventListener('abort', onAbort, { once: true });
        try {
          controller.signal.throwIfAborted();
          resolve(await work(controller.signal));
        } catch (error) {
          reject(error);
        } finally {
          // The caller's signal may live for a whole night: nothing of ours stays on it.
          signal?.removeEventListener('abort', onAbort);
          this.#current = undefined;
        }
        this.#beginNext();
      };
      this.#waiting.push({ begin, reject });
      if (!this.isBusy) this.#beginNext();
    });
  }

  /** Rejects what waits, and asks what runs to end. */
  interrupt(reason: unknown): void {
    for (const operation of this.#waiting.splice(0)) operation.reject(reason);
    this.#current?.abort(reason);
  }

  #beginNext(): void {
    // begin never rejects: every outcome goes to the operation's own promise.
    void this.#waiting.shift()?.begin();
  }
}
