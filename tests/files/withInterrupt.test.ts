import { describe, expect, it } from 'vitest';
import { withInterrupt } from '../../src/files/withInterrupt.js';
import { builtCopy } from './builtCopy.js';
import { freshFolder, startScript } from './runScript.js';

const copy = freshFolder();
builtCopy(copy);

/** The last line of a script: how its run ended. */
function outcomeOf(lines: readonly string[]): unknown {
  return JSON.parse(lines.at(-1)!);
}

describe('a run that can be interrupted', () => {
  it('gives its value or its error, and takes its handlers away', async () => {
    const before = ['SIGINT', 'SIGTERM'].map((name) => process.listenerCount(name));
    expect(await withInterrupt(() => Promise.resolve(7))).toEqual({ value: 7, interrupted: false });
    const fault = new Error('of the run');
    await expect(withInterrupt(() => Promise.reject(fault))).rejects.toBe(fault);
    const abort = new DOMException('not by a signal', 'AbortError');
    await expect(withInterrupt(() => Promise.reject(abort))).rejects.toBe(abort);
    expect(['SIGINT', 'SIGTERM'].map((name) => process.listenerCount(name))).toEqual(before);
  });

  it('tells an interrupt from an error', async () => {
    // Handlers are called as the system would, without ending the process that runs the tests.
    const interrupt = (): void => void process.emit('SIGINT');
    const giveUp = withInterrupt<number>((signal) => {
      interrupt();
      interrupt();
      signal.throwIfAborted();
      return Promise.resolve(1);
    });
    expect(await giveUp).toEqual({ interrupted: true });
    const partly = withInterrupt((signal) => {
      interrupt();
      return Promise.resolve(signal.aborted);
    });
    expect(await partly).toEqual({ value: true, interrupted: true });
    const fault = new Error('of the disk');
    const failing = withInterrupt(() => {
      interrupt();
      return Promise.reject(fault);
    });
    await expect(failing).rejects.toBe(fault);
  });

  it.concurrent('ends by itself when nothing interrupts it', async () => {
    const { code, lines, stderr } = await startScript(copy, 'interruptedRun', [5, 1, 1000]).end;
    expect([code, stderr]).toEqual([0, '']);
    expect(lines.slice(0, -1)).toEqual(['1', '2', '3', '4', '5']);
    expect(outcomeOf(lines)).toEqual({ delivered: 5, ended: 'all', interrupted: false });
  });

  it.concurrent('ends by itself when a worker fails, though others are at work', async () => {
    const { code, lines, stderr } = await startScript(copy, 'interruptedRun', [5, 1, 1000, 'throw']).end;
    expect([code, stderr, lines.at(-1)]).toEqual([
      0,
      '',
      expect.stringMatching(/^job [23] failed: the light/),
    ]);
  });

  it.concurrent.each(['SIGINT', 'SIGTERM'] as const)('ends in good order on %s', async (signal) => {
    const script = startScript(copy, 'interruptedRun', [100_000, 5, 30_000]);
    await script.printed('3');
    script.child.kill(signal);
    const { code, lines, stderr } = await script.end;
    expect([code, stderr]).toEqual([130, '']);
    const delivered = lines.slice(0, -1).filter((line) => line !== 'interrupted');
    expect(delivered).toEqual(delivered.map((_, k) => String(k + 1)));
    expect(outcomeOf(lines)).toEqual({ delivered: delivered.length, ended: 'aborted', interrupted: true });
  });

  it.concurrent('does not wait for workers that never end', async () => {
    const script = startScript(copy, 'interruptedRun', [100, 0, 20, 'never']);
    await script.printed('1');
    script.child.kill('SIGINT');
    const { code, lines } = await script.end;
    expect([code, lines.slice(0, -1)]).toEqual([130, ['1', 'interrupted']]);
    expect(outcomeOf(lines)).toEqual({ delivered: 1, ended: 'aborted', interrupted: true });
  });

  it.concurrent(
    'takes a signal that comes twice at once for one, and another one later at its word',
    async () => {
      const script = startScript(copy, 'interruptedRun', [100, 0, 600_000, 'never']);
      await script.printed('1');
      script.child.kill('SIGINT');
      script.child.kill('SIGINT');
      await script.printed('interrupted');
      await new Promise((wake) => setTimeout(wake, 300));
      expect(script.child.exitCode).toBe(null);
      script.child.kill('SIGINT');
      const { code, lines } = await script.end;
      expect([code, lines]).toEqual([130, ['1', 'interrupted']]);
    },
  );
});
