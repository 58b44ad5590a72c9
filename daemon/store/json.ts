/** JSON for the record. A number that is not finite would silently become null: it is refused, with the place it stands. */
export function toJson(what: string, value: unknown): string {
  return JSON.stringify(value, (key, part) => {
    if (typeof part === 'number' && !Number.isFinite(part)) {
      throw new Error(`${what}: the number at "${key}" is ${part}; nothing was stored.`);
    }
    return part;
  });
}

export function fromJson<Shape>(text: string): Shape {
  return JSON.parse(text) as Shape;
}
