/** The part of the WebAssembly interface that is used; neither the ES library nor Node's types declare it. */
declare namespace WebAssembly {
  class Memory {
    constructor(descriptor: { initial: number; maximum?: number });
    readonly buffer: ArrayBuffer;
    grow(pages: number): number;
  }
  class Module {
    constructor(bytes: Uint8Array);
  }
  class Instance {
    constructor(module: Module, imports: Readonly<Record<string, unknown>>);
    readonly exports: Readonly<Record<string, unknown>>;
  }
}
