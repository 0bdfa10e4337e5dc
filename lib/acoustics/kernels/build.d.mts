/** The compiler's own name for its version, or null where there is none. */
export function compilerVersion(): string | null;
/** Compile the sources. */
export function compileKernels(): Buffer;
