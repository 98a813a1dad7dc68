// What a scene refuses: a description that makes no physical sense. Raised when the scene is built, never
// while it measures.

export class SceneError extends Error {
  override readonly name = 'SceneError';
  readonly code = 'SCENE_INVALID';
  /** The value that was refused, by its name in the description. */
  readonly facts: Readonly<Record<string, string | number>>;

  constructor(message: string, facts: Readonly<Record<string, string | number>> = {}) {
    super(message);
    this.facts = facts;
  }
}
