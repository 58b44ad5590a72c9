/** Given from outside, waited for inside. One while nobody waits is not lost; several are one. */
export interface Summons {
  give(): void;
  given(): Promise<void>;
}

export function createSummons(): Summons {
  let isGiven = false;
  let answer = () => {};
  return {
    give() {
      isGiven = true;
      answer();
    },
    async given() {
      if (!isGiven) {
        await new Promise<void>((resolve) => {
          answer = resolve;
        });
      }
      isGiven = false;
    },
  };
}
