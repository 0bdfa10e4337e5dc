/**
 * Builds the kernels with clang and lld (Debian's packages of these names): `node lib/acoustics/kernels/build.mjs`.
 * The bytes go into module.ts, with the compiler's version, so that nothing is compiled at install or run time.
 */
import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

const HERE = dirname(fileURLToPath(import.meta.url));
const SOURCES = ['levels.c', 'filter.c', 'spectrum.c'];
/** One arena: what a channel of the longest window needs, with room to spare; pages that are not used cost nothing. */
const MEMORY_BYTES = 8 << 20;
const STACK_BYTES = 16 << 10;

/** The compiler's own name for its version, or null where there is none. */
export function compilerVersion() {
  try {
    const [first] = execFileSync('clang', ['--version'], { encoding: 'utf8' }).split('\n');
    execFileSync('wasm-ld', ['--version'], { stdio: 'ignore' });
    return first ?? null;
  } catch {
    return null;
  }
}

/** Compile the sources. @returns {Buffer} the module's bytes, the same for the same compiler and sources */
export function compileKernels() {
  const folder = mkdtempSync(join(tmpdir(), 'kernels-'));
  try {
    const out = join(folder, 'kernels.wasm');
    execFileSync(
      'clang',
      [
        '--target=wasm32',
        '-msimd128',
        '-O3',
        '-fno-math-errno',
        '-ffreestanding',
        '-nostdlib',
        '-Wall',
        '-Werror',
        '-Wl,--no-entry',
        '-Wl,--strip-all',
        '-Wl,--export=__heap_base',
        '-Wl,-z,stack-size=' + STACK_BYTES,
        '-Wl,--initial-memory=' + MEMORY_BYTES,
        '-Wl,--max-memory=' + MEMORY_BYTES,
        '-o',
        out,
        ...SOURCES.map((name) => join('c', name)),
      ],
      { cwd: HERE, stdio: ['ignore', 'inherit', 'inherit'] },
    );
    return readFileSync(out);
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const bytes = compileKernels();
  const lines = bytes.toString('base64').match(/.{1,110}/g) ?? [];
  writeFileSync(
    join(HERE, 'module.ts'),
    `/** Made by build.mjs from c/. Do not edit. */
export const COMPILER = ${JSON.stringify(compilerVersion()).replaceAll("'", "\\'").replaceAll('"', "'")};
export const MODULE_BASE64 = [
${lines.map((line) => `  '${line}',`).join('\n')}
].join('');
`,
  );
  console.log(`${bytes.length} bytes`);
}
