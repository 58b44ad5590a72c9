/**
 * For crash tests alone: with SPINVIGIL_TEST_KILL_AT=n in the environment the process kills itself, as kill -9 would, at the
 * n-th step it comes to. Without that variable a step does nothing. The names say where in the work a crash was tried.
 */
const { SPINVIGIL_TEST_KILL_AT } = process.env;
const killAt = Number(SPINVIGIL_TEST_KILL_AT ?? 0);
let stepsPassed = 0;

export function step(_name: string): void {
  if (!(killAt > 0)) return;
  stepsPassed += 1;
  if (stepsPassed === killAt) process.kill(process.pid, 'SIGKILL');
}
