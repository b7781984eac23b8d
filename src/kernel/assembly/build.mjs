// Compiles every kernel of this folder into one WebAssembly module and writes it as base64 into ../generated, so that the same
// file runs in Node and in a browser.
import { mkdirSync, writeFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import asc from 'assemblyscript/asc';

const here = fileURLToPath(new URL('.', import.meta.url));
const { error, stderr, binary } = await compile();
if (error) {
  process.stderr.write(`${stderr}\n${error.message}\n`);
  process.exit(1);
}
const folder = new URL('../generated/', import.meta.url);
mkdirSync(folder, { recursive: true });
writeFileSync(
  new URL('kernelModule.ts', folder),
  `/** The compiled kernels, written by src/kernel/assembly/build.mjs. */\nexport const KERNEL_MODULE =\n  '${Buffer.from(binary).toString('base64')}';\n`,
);

async function compile() {
  let binary;
  const options = ['index.ts', '-O3', '--noAssert', '--enable', 'simd', '--runtime', 'stub', '--importMemory'];
  const { error, stderr } = await asc.main([...options, '--baseDir', here, '--outFile', 'kernels.wasm'], {
    writeFile: (name, contents) => {
      if (name.endsWith('.wasm')) binary = contents;
    },
  });
  return { error, stderr: stderr.toString(), binary };
}
