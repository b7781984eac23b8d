import type { Worker } from 'node:worker_threads';
import { startWorker } from './startWorker.js';
import type { JobMessage, ReplyMessage } from './workerMessages.js';
import { errorOf } from './workerMessages.js';

/** What a pool of workers is to do. */
export interface PoolRun<Job, Result> {
  /**
   * Workers to start at most; none is started that has nothing to do. With 1, the work is still done beside
   * the main thread.
   */
  readonly workers: number;
  /**
   * Module that calls `serveJobs`, named with the ending `.js`: `new URL('./trialWorker.js',
   * import.meta.url)`.
   */
  readonly entry: URL;
  /** Copied (structured clone) once to each worker. */
  readonly setup: unknown;
  /**
   * The jobs in order, or a function that gives the one of an index from 0, and undefined when there are no
   * more.
   */
  readonly jobs: Iterable<Job> | ((index: number) => Job | undefined);
  /**
   * Called in the order of the jobs, never in that of arrival, and never while an earlier call is still under
   * way. `stop` ends the run: no result behind it is delivered. What it throws ends the run with that error.
   */
  readonly onResult: (result: Result, job: Job) => PoolVerdict | Promise<PoolVerdict>;
  /**
   * A result that is known already, such as one kept on disk: the job is not given to a worker, and is
   * delivered in its place.
   */
  readonly known?: (job: Job) => Promise<Result> | undefined;
  /** What to call a job in an error; without it, `job 3`. */
  readonly nameOf?: (job: Job) => string;
  /**
   * Ends the run early. Jobs that are with the workers may still end, and are delivered in order, within the
   * grace.
   */
  readonly signal?: AbortSignal;
  /** Time that workers have to end what they do when the run is aborted; 1000 if not given. */
  readonly graceMilliseconds?: number;
}

/** `stop` ends the run. */
export type PoolVerdict = void | 'stop';

/** How a run of a pool ended. */
export interface PoolOutcome {
  /** Results delivered: those of the first jobs in order, without a gap. */
  readonly delivered: number;
  /** All jobs are done, or `onResult` said stop, or the signal was aborted before the last one. */
  readonly ended: 'all' | 'stopped' | 'aborted';
}

/** Jobs between handing out and delivery, per worker: one to work on and one to go on with at once. */
const IN_FLIGHT_PER_WORKER = 2;
const GRACE_MILLISECONDS = 1000;

/**
 * Runs jobs on worker threads and delivers their results in the order of the jobs. At most twice as many jobs
 * as there are workers are between handing out and delivery, early results included: memory stays bounded,
 * and a slow `onResult` slows the workers. When the promise settles, all workers have ended and nothing keeps
 * the process alive.
 * @throws (rejects with) an Error that names the job when a worker throws or dies, an InputError of a worker
 * as it was, what `onResult`, `jobs` or `known` throw, DataCloneError for what cannot be copied. RangeError
 * for a number of workers below 1.
 * Cost, measured: 15 to 35 microseconds a job, and 40 ms for a worker to start, so that jobs of 20 ms and
 * more are worth sending
 */
export function runChunks<Job, Result>(run: PoolRun<Job, Result>): Promise<PoolOutcome> {
  if (!(Number.isInteger(run.workers) && run.workers >= 1)) {
    throw new RangeError(`a pool of ${run.workers} workers`);
  }
  return new Promise((fulfil, reject) => new Pool(run, fulfil, reject).start());
}

/** A worker and the indices of the jobs that it has, in the order in which it does them. */
interface Member {
  readonly worker: Worker;
  readonly jobs: number[];
}

/** A job between handing out and delivery. */
interface Pending<Job, Result> {
  readonly job: Job;
  arrived?: { readonly result: Result };
}

class Pool<Job, Result> {
  private readonly members: Member[] = [];
  private readonly pending = new Map<number, Pending<Job, Result>>();
  private readonly nextJob: (index: number) => Job | undefined;
  private readonly closeJobs: () => void;
  private handedOut = 0;
  private delivered = 0;
  private exhausted = false;
  private aborting = false;
  private ended: PoolOutcome['ended'] | undefined;
  private failure: { readonly error: unknown } | undefined;
  private delivering = false;
  /** The latest round of deliveries, to be waited for at the end. */
  private delivery: Promise<void> | undefined;
  private grace: NodeJS.Timeout | undefined;

  constructor(
    private readonly run: PoolRun<Job, Result>,
    private readonly fulfil: (outcome: PoolOutcome) => void,
    private readonly reject: (error: unknown) => void,
  ) {
    const { jobs } = run;
    if (typeof jobs === 'function') {
      this.nextJob = jobs;
      this.closeJobs = () => undefined;
    } else {
      const iterator = jobs[Symbol.iterator]();
      this.nextJob = () => {
        const next = iterator.next();
        return next.done === true ? undefined : next.value;
      };
      this.closeJobs = () => void iterator.return?.();
    }
  }

  start(): void {
    const { signal } = this.run;
    if (signal?.aborted === true) return this.end('aborted');
    signal?.addEventListener('abort', this.abort);
    this.handOut();
  }

  private readonly abort = (): void => {
    this.aborting = true;
    this.grace = setTimeout(() => this.end('aborted'), this.run.graceMilliseconds ?? GRACE_MILLISECONDS);
    this.endIfIdle();
  };

  private handOut(): void {
    try {
      const most = IN_FLIGHT_PER_WORKER * this.run.workers;
      while (!this.closing() && !this.exhausted && this.handedOut - this.delivered < most) {
        const job = this.nextJob(this.handedOut);
        if (job === undefined) this.exhausted = true;
        else this.handOutOne(job, this.handedOut++);
      }
    } catch (error) {
      this.fail(error);
    }
    this.endIfIdle();
  }

  private handOutOne(job: Job, index: number): void {
    this.pending.set(index, { job });
    const known = this.run.known?.(job);
    if (known !== undefined) {
      known.then(
        (result) => this.arrive(index, result),
        (error: unknown) => this.fail(error),
      );
      return;
    }
    const member = this.idlest();
    member.jobs.push(index);
    member.worker.postMessage({ index, job } satisfies JobMessage);
  }

  /** The worker with the fewest jobs; a new one as long as there may be more and all have something to do. */
  private idlest(): Member {
    let best: Member | undefined;
    for (const member of this.members) {
      if (best === undefined || member.jobs.length < best.jobs.length) best = member;
    }
    if (best !== undefined && (best.jobs.length === 0 || this.members.length >= this.run.workers))
      return best;
    return this.addMember();
  }

  private addMember(): Member {
    const worker = startWorker(this.run.entry, this.run.setup);
    const member: Member = { worker, jobs: [] };
    worker.on('message', (reply: ReplyMessage) => this.receive(member, reply));
    worker.on('messageerror', (error) => this.fail(this.deathOf(member, error.message)));
    worker.on('error', (error: unknown) => {
      this.fail(this.deathOf(member, error instanceof Error ? error.message : String(error), error));
    });
    worker.on('exit', (code) => this.fail(this.deathOf(member, `it ended with code ${code}`)));
    this.members.push(member);
    return member;
  }

  private receive(member: Member, reply: ReplyMessage): void {
    if (this.ended !== undefined) return;
    member.jobs.shift();
    if ('fault' in reply) this.fail(errorOf(reply.fault, this.nameOf(reply.index)));
    else this.arrive(reply.index, reply.result as Result);
  }

  private arrive(index: number, result: Result): void {
    if (this.ended !== undefined) return;
    this.pending.get(index)!.arrived = { result };
    if (!this.delivering) this.delivery = this.deliver();
  }

  /** Delivers what is there in order, up to the first job that is not done. */
  private async deliver(): Promise<void> {
    this.delivering = true;
    try {
      for (;;) {
        const head = this.pending.get(this.delivered);
        if (head?.arrived === undefined || this.ended !== undefined) return;
        const called = this.run.onResult(head.arrived.result, head.job);
        const verdict = called instanceof Promise ? await called : called;
        this.pending.delete(this.delivered++);
        if (verdict === 'stop') return this.end('stopped');
        this.handOut();
      }
    } catch (error) {
      // Even when the run has ended meanwhile: a result that could not be kept is no good end.
      this.failure ??= { error };
      this.end('aborted');
    } finally {
      this.delivering = false;
    }
  }

  private closing(): boolean {
    return this.aborting || this.ended !== undefined;
  }

  private endIfIdle(): void {
    if (this.pending.size > 0) return;
    if (this.exhausted) this.end('all');
    else if (this.aborting) this.end('aborted');
  }

  /** Workers that the pool has ended itself are no fault. */
  private fail(error: unknown): void {
    if (this.ended !== undefined) return;
    this.failure = { error };
    this.end('aborted');
  }

  private end(how: PoolOutcome['ended']): void {
    if (this.ended !== undefined) return;
    this.ended = how;
    void this.shutDown(how);
  }

  private async shutDown(how: PoolOutcome['ended']): Promise<void> {
    clearTimeout(this.grace);
    this.run.signal?.removeEventListener('abort', this.abort);
    try {
      this.closeJobs();
    } catch (error) {
      this.failure ??= { error };
    }
    await Promise.all(this.members.map(({ worker }) => worker.terminate()));
    await this.delivery;
    if (this.failure !== undefined) this.reject(this.failure.error);
    else this.fulfil({ delivered: this.delivered, ended: how });
  }

  private nameOf(index: number): string {
    const job = this.pending.get(index)?.job;
    return (job === undefined ? undefined : this.run.nameOf?.(job)) ?? `job ${index + 1}`;
  }

  private deathOf(member: Member, why: string, cause?: unknown): Error {
    const [first] = member.jobs;
    const where = first === undefined ? 'with nothing to do' : `with ${this.nameOf(first)}`;
    return new Error(`a worker ended by itself ${where}: ${why}`, { cause });
  }
}
