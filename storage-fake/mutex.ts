/** One at a time for each name, in the order they came. */
export class NamedMutex {
  private readonly tails = new Map<string, Promise<void>>();

  async run<T>(name: string, work: () => Promise<T>): Promise<T> {
    const before = this.tails.get(name) ?? Promise.resolve();
    let release: () => void = () => undefined;
    const tail = new Promise<void>((resolve) => {
      release = resolve;
    });
    const mine = before.then(() => tail);
    this.tails.set(name, mine);
    await before;
    try {
      return await work();
    } finally {
      release();
      if (this.tails.get(name) === mine) this.tails.delete(name);
    }
  }
}
