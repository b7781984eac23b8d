/** Exit code of a run that was interrupted. */
export const INTERRUPTED = 130;

/** How a run ended that could be interrupted. */
export interface Interruptible<T> {
  /** What the run returned; absent when it gave up on the interrupt with an AbortError. */
  readonly value?: T;
  readonly interrupted: boolean;
}

/**
 * A terminal signals its whole group, and a launcher such as npm passes the signal on once more: that is one
 * Ctrl-C, not two.
 */
const ECHO_MILLISECONDS = 250;

/**
 * Runs something that Ctrl-C (SIGINT) or SIGTERM shall end in good order: the first one aborts the signal
 * that `run` was given, and what `run` then returns is the result so far. A second one ends the process at
 * once, with code 130. Afterwards signals act as they did before.
 * @throws what `run` throws, except an AbortError after an interrupt
 */
export async function withInterrupt<T>(run: (signal: AbortSignal) => Promise<T>): Promise<Interruptible<T>> {
  const controller = new AbortController();
  let first = -Infinity;
  const onSignal = (): void => {
    const now = performance.now();
    if (!controller.signal.aborted) {
      first = now;
      controller.abort();
    } else if (now - first > ECHO_MILLISECONDS) {
      // Should a worker keep the process from ending, the next signal takes its ordinary course.
      removeHandlers();
      process.exit(INTERRUPTED);
    }
  };
  const removeHandlers = (): void => {
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
  };
  process.on('SIGINT', onSignal);
  process.on('SIGTERM', onSignal);
  try {
    const value = await run(controller.signal);
    return { value, interrupted: controller.signal.aborted };
  } catch (error) {
    if (controller.signal.aborted && isAbort(error)) return { interrupted: true };
    throw error;
  } finally {
    removeHandlers();
  }
}

function isAbort(error: unknown): boolean {
  return error instanceof Error && error.name === 'AbortError';
}
