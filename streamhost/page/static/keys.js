// Keys: what each does, and which of them rest. Space always mutes, wherever the focus is.

export class Keys {
  constructor(actions, mute) {
    this.actions = actions;
    this.mute = mute;
    this.lettersRest = false;
    this.whole = false;
    window.addEventListener('keydown', event => this.press(event), true);
  }

  press(event) {
    if (event.key === ' ') {
      event.preventDefault();
      this.mute();
      return;
    }
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    const writes = event.target instanceof Element && event.target.matches('input, textarea');
    if (event.key.length === 1 && (writes || this.lettersRest)) return;
    if (event.key === 'Enter' && event.target instanceof Element && event.target.matches('button')) return;
    if (event.key === 'g') {
      this.whole = true;
      return;
    }
    const name = this.whole && '123'.includes(event.key) ? `g${event.key}` : event.key;
    this.whole = false;
    const action = this.actions[name];
    if (action) {
      event.preventDefault();
      action();
    }
  }
}
