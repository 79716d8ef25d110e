/** States what must hold if our own code is right; a failure is a fault of ours (exit code 70). */
export function assert(condition: boolean, message: () => string): asserts condition {
  if (!condition) throw new Error(`internal: ${message()}; please report this`);
}
