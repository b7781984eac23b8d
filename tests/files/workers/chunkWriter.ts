/**
 * Goes on with a run of so many chunks in a folder and tells each that is kept; to be killed. Arguments:
 * folder, number of chunks, and `hang` to stop for ever in the middle of writing the last one.
 */
import { writeFileSync, writeSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { openChunkStore } from '../../../src/files/chunkStore.js';
import { writeTemporary } from '../../../src/files/writeFile.js';
import { chunkOf, PLAN } from './chunkContent.js';

const [folder, count, hang] = process.argv.slice(2);
const last = Number(count);
const store = await openChunkStore(folder!, PLAN, {
  resume: true,
  force: false,
  writeTemporary: async (path, content) => {
    if (hang === undefined || !path.endsWith(`${last}.bin`)) return writeTemporary(path, content);
    writeFileSync(join(dirname(path), `.chunk.${process.pid}.partial`), content.slice(0, content.length / 2));
    writeSync(1, 'hanging\n');
    await new Promise((wake) => setTimeout(wake, 60_000));
    return path;
  },
});
writeSync(1, 'open\n');
for (let number = 1; number <= last; number++) {
  if (store.has(number)) continue;
  await store.save(chunkOf(number));
  writeSync(1, `${number}\n`);
}
