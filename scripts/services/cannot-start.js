/** A reason not to start that the person can act on: its message is printed alone, without a stack. */
export class CannotStart extends Error {}
