/** A queue of numbers that always gives the smallest first; -1 when it is empty. */
export class MinimumHeap {
  private readonly items: number[] = [];

  get size(): number {
    return this.items.length;
  }

  push(value: number): void {
    const { items } = this;
    let at = items.length;
    items.push(value);
    while (at > 0) {
      const parent = (at - 1) >> 1;
      if (items[parent]! <= value) break;
      items[at] = items[parent]!;
      at = parent;
    }
    items[at] = value;
  }

  pop(): number {
    const { items } = this;
    if (items.length === 0) return -1;
    const first = items[0]!;
    const last = items.pop()!; // not empty: checked above
    if (items.length === 0) return first;
    let at = 0;
    for (;;) {
      let child = 2 * at + 1;
      if (child >= items.length) break;
      if (child + 1 < items.length && items[child + 1]! < items[child]!) child++;
      if (items[child]! >= last) break;
      items[at] = items[child]!;
      at = child;
    }
    items[at] = last;
    return first;
  }
}
