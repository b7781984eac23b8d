import { describe, expect, it } from 'vitest';
import { InputError } from '../../src/errors/InputError.js';
import { sensibleWorkers } from '../../src/files/sensibleWorkers.js';
import type { PoolOutcome, PoolRun } from '../../src/files/workerPool.js';
import { runChunks } from '../../src/files/workerPool.js';
import { builtCopy, workerIn } from './builtCopy.js';
import { freshFolder } from './runScript.js';
import type { Answer, Order } from './workers/obedientWorker.js';

const copy = freshFolder();
builtCopy(copy);
const ENTRY = workerIn(copy, 'obedientWorker');

/** A pool on the obedient worker, and the numbers that it has delivered. */
function start(
  orders: readonly Order[],
  options: Partial<PoolRun<Order, Answer>> = {},
): { readonly delivered: number[]; readonly outcome: Promise<PoolOutcome> } {
  const delivered: number[] = [];
  const outcome = runChunks<Order, Answer>({
    workers: 2,
    entry: ENTRY,
    setup: { greeting: 'hello' },
    jobs: orders,
    onResult: ({ number }) => void delivered.push(number),
    nameOf: ({ number }) => `chunk ${number}`,
    ...options,
  });
  return { delivered, outcome };
}

function orders(count: number, order: (number: number) => Omit<Order, 'number'> = () => ({})): Order[] {
  return Array.from({ length: count }, (_, k) => ({ number: k + 1, ...order(k + 1) }));
}

const upTo = (count: number): number[] => Array.from({ length: count }, (_, k) => k + 1);

const sleep = (milliseconds: number): Promise<void> => new Promise((wake) => setTimeout(wake, milliseconds));

describe('results of a pool', () => {
  it.each([1, 2, 8])('come in the order of the jobs from %i workers with uneven times', async (workers) => {
    // The first of every four takes longest.
    const uneven = orders(40, (number) => ({ milliseconds: number % 4 === 1 ? 12 : (number * 7) % 5 }));
    const { delivered, outcome } = start(uneven, { workers });
    expect(await outcome).toEqual({ delivered: 40, ended: 'all' });
    expect(delivered).toEqual(upTo(40));
  });

  it('come whole, each with its job, the setup given once to each worker', async () => {
    const list = orders(9);
    const seen: [Answer, Order][] = [];
    const { outcome } = start(list, { onResult: (answer, job) => void seen.push([answer, job]) });
    await outcome;
    expect(seen.map(([, job]) => job)).toEqual(list);
    for (const [{ number, greeting, rows }, job] of seen) {
      expect([number, greeting]).toEqual([job.number, 'hello']);
      expect(rows).toEqual(Float64Array.of(job.number, job.number / 3));
    }
    // A buffer that was handed over is empty where it came from.
    expect(seen.map(([{ keptLength }]) => keptLength)).toEqual(list.map(() => 0));
  });

  it('are at most two per worker ahead of the delivery, early ones included', async () => {
    let handedOut = 0;
    let delivered = 0;
    let most = 0;
    const { outcome } = start([], {
      workers: 3,
      jobs: (index) => {
        if (index === 30) return undefined;
        most = Math.max(most, ++handedOut - delivered);
        return { number: index + 1, milliseconds: index === 0 ? 40 : 0 };
      },
      onResult: async () => {
        await sleep(1);
        delivered++;
      },
    });
    expect((await outcome).delivered).toBe(30);
    expect(most).toBe(6);
  });

  it('are never delivered while an earlier delivery is under way', async () => {
    let under = 0;
    const { outcome } = start(orders(12), {
      onResult: async () => {
        expect(++under).toBe(1);
        await sleep(2);
        under--;
      },
    });
    expect((await outcome).delivered).toBe(12);
  });

  it('that are known take their place without a worker', async () => {
    const given: number[] = [];
    const { delivered, outcome } = start(orders(200), {
      // Every job except two, told at once or later.
      known: ({ number }) => {
        if (number === 50 || number === 120) return void given.push(number);
        const answer = { number, greeting: 'kept', rows: new Float64Array(0), keptLength: 0 };
        return number % 3 === 0 ? sleep(1).then(() => answer) : Promise.resolve(answer);
      },
    });
    expect(await outcome).toEqual({ delivered: 200, ended: 'all' });
    expect(delivered).toEqual(upTo(200));
    expect(given).toEqual([50, 120]);
  });

  it('come from sources as from what is built of them', async () => {
    const entry = new URL('./workers/obedientWorker.js', import.meta.url);
    expect(await start(orders(5), { entry }).outcome).toEqual({ delivered: 5, ended: 'all' });
    const source = new URL('./workers/obedientWorker.ts', import.meta.url);
    expect((await start(orders(2), { entry: source, workers: 1 }).outcome).delivered).toBe(2);
  });

  it('are none when there are no jobs', async () => {
    expect(await start([]).outcome).toEqual({ delivered: 0, ended: 'all' });
  });
});

describe('a pool that is stopped', () => {
  it('by a result delivers none behind it, and closes its jobs', async () => {
    const delivered: number[] = [];
    let closed = false;
    const jobs = (function* (): Generator<Order> {
      try {
        for (let number = 1; ; number++) yield { number };
      } finally {
        closed = true;
      }
    })();
    const outcome = await start([], {
      jobs,
      onResult: ({ number }) => {
        delivered.push(number);
        return number === 5 ? 'stop' : undefined;
      },
    }).outcome;
    expect(outcome).toEqual({ delivered: 5, ended: 'stopped' });
    expect([delivered, closed]).toEqual([upTo(5), true]);
  });

  it('by an abort delivers in order what is done within the grace', async () => {
    const controller = new AbortController();
    const delivered: number[] = [];
    const { outcome } = start(
      orders(100, () => ({ milliseconds: 5 })),
      {
        signal: controller.signal,
        onResult: ({ number }) => {
          delivered.push(number);
          if (number === 6) controller.abort();
        },
      },
    );
    const { delivered: count, ended } = await outcome;
    expect(ended).toBe('aborted');
    // Those that the workers had at the abort are delivered too, none beyond them.
    expect(count).toBe(9);
    expect(delivered).toEqual(upTo(9));
  });

  it('by an abort waits no longer than the grace for workers that do not end', async () => {
    const controller = new AbortController();
    const list = orders(20, (number) => (number === 4 ? { behave: 'never' } : {}));
    const { delivered, outcome } = start(list, {
      signal: controller.signal,
      graceMilliseconds: 50,
      onResult: ({ number }) => {
        delivered.push(number);
        if (number === 3) controller.abort();
      },
    });
    const before = performance.now();
    expect(await outcome).toEqual({ delivered: 3, ended: 'aborted' });
    expect(delivered).toEqual(upTo(3));
    expect(performance.now() - before).toBeLessThan(5000);
  });

  it('before it begins does nothing', async () => {
    const { delivered, outcome } = start(orders(3), { signal: AbortSignal.abort() });
    expect(await outcome).toEqual({ delivered: 0, ended: 'aborted' });
    expect(delivered).toEqual([]);
  });

  it('while a result is being kept waits for that', async () => {
    const controller = new AbortController();
    let kept = false;
    const { outcome } = start(orders(10), {
      signal: controller.signal,
      graceMilliseconds: 0,
      onResult: async () => {
        controller.abort();
        await sleep(60);
        kept = true;
      },
    });
    expect(await outcome).toEqual({ delivered: 1, ended: 'aborted' });
    expect(kept).toBe(true);
  });

  it('tells when a result could not be kept, even after an abort', async () => {
    const controller = new AbortController();
    const { outcome } = start(orders(10), {
      signal: controller.signal,
      graceMilliseconds: 0,
      onResult: async () => {
        controller.abort();
        await sleep(60);
        throw new InputError('file/unwritable', 'the disk is full', 'Make room.');
      },
    });
    await expect(outcome).rejects.toMatchObject({ code: 'file/unwritable' });
  });
});

describe('a pool in trouble', () => {
  const bad = (behave: NonNullable<Order['behave']>): Order[] =>
    orders(10, (number) => (number === 5 ? { behave } : {}));

  it.each([
    ['throw', /^chunk 5 failed: the light went out$/],
    ['exit', /^a worker ended by itself with chunk 5: it ended with code 7$/],
    ['uncaught', /^a worker ended by itself with chunk 5: from nowhere$/],
    ['uncloneable', /^chunk 5 failed: .*could not be cloned/],
  ] as const)('names the job when a worker does this: %s', async (behave, message) => {
    const { delivered, outcome } = start(bad(behave));
    await expect(outcome).rejects.toThrow(message);
    expect(delivered).toEqual(upTo(delivered.length));
    expect(delivered.length).toBeLessThan(5);
  });

  it('passes a fault of the input on as it is', async () => {
    await expect(start(bad('input-error')).outcome).rejects.toEqual(
      new InputError('test/fault', 'x.csv: a fault', 'Mend it.'),
    );
  });

  it('names jobs by their number when it is given no names', async () => {
    const outcome = runChunks<Order, Answer>({
      workers: 1,
      entry: ENTRY,
      setup: { greeting: '' },
      jobs: bad('throw'),
      onResult: () => undefined,
    });
    await expect(outcome).rejects.toThrow(/^job 5 failed/);
  });

  it('tells a worker that cannot be prepared, does not serve, or is not there', async () => {
    await expect(start(orders(3), { setup: { fail: true } }).outcome).rejects.toThrow(
      /^chunk [12] failed: cannot be prepared$/,
    );
    for (const [name, message] of [
      ['silentWorker', /^a worker ended by itself with chunk [12]: it ended with code 0$/],
      ['noSuchWorker', /^a worker ended by itself with chunk [12]: Cannot find module/],
    ] as const) {
      await expect(start(orders(3), { entry: workerIn(copy, name) }).outcome).rejects.toThrow(message);
    }
  });

  it('ends with the error of its caller', async () => {
    const fault = new InputError('file/unwritable', 'the disk is full', 'Make room.');
    const failing = (): never => {
      throw fault;
    };
    await expect(start(orders(5), { onResult: failing }).outcome).rejects.toBe(fault);
    await expect(start(orders(5), { onResult: () => Promise.reject(fault) }).outcome).rejects.toBe(fault);
    await expect(start(orders(5), { jobs: failing }).outcome).rejects.toBe(fault);
    await expect(start(orders(5), { known: () => Promise.reject(fault) }).outcome).rejects.toBe(fault);
    await expect(start(orders(5), { setup: failing }).outcome).rejects.toThrow(/could not be cloned/);
    expect(() => start(orders(5), { workers: 0 })).toThrow(RangeError);
    expect(() => start(orders(5), { workers: NaN })).toThrow(RangeError);
  });
});

describe('a sensible number of workers', () => {
  it('is one per core, or what was asked for', () => {
    expect(sensibleWorkers(undefined, 6)).toBe(6);
    expect(sensibleWorkers()).toBeGreaterThanOrEqual(1);
    for (const requested of [1, 2, 8, 24]) expect(sensibleWorkers(requested, 6)).toBe(requested);
    expect([sensibleWorkers(16, 1), sensibleWorkers(256, 128), sensibleWorkers(undefined, 500)]).toEqual([
      16, 256, 256,
    ]);
  });

  it.each([0, -1, 1.5, NaN, Infinity, 25])('is not %d on 6 cores', (requested) => {
    expect(() => sensibleWorkers(requested, 6)).toThrow(expect.objectContaining({ code: 'run/workers' }));
    expect(() => sensibleWorkers(257, 128)).toThrow(/^257 is not/);
  });
});
