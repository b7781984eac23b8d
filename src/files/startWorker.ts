import { existsSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { Worker } from 'node:worker_threads';

/**
 * Starts a worker on a module of this program, named as an import names it: with the ending `.js`. When the
 * program runs from its sources (in tests and in development), the module is the `.ts` file of that name,
 * which the worker must first learn to load.
 * @throws DataCloneError when `workerData` cannot be cloned
 */
export function startWorker(entry: URL, workerData: unknown): Worker {
  const source = sourceOf(entry);
  if (source === undefined) return new Worker(entry, { workerData });
  const loader = import.meta.resolve('tsx/esm/api');
  const script =
    `import(${JSON.stringify(loader)})` +
    `.then(({ register }) => { register(); return import(${JSON.stringify(source.href)}); });`;
  return new Worker(script, { eval: true, workerData });
}

/**
 * The TypeScript source that stands in place of a built module, or undefined when the module itself is there.
 */
function sourceOf(entry: URL): URL | undefined {
  if (entry.pathname.endsWith('.ts')) return entry;
  if (!entry.pathname.endsWith('.js') || existsSync(fileURLToPath(entry))) return undefined;
  const source = new URL(entry.href.replace(/\.js$/, '.ts'));
  return existsSync(fileURLToPath(source)) ? source : undefined;
}
