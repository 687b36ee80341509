// The foot: the last notice, alarms in reverse until they are seen, the state of the output, and all of it as text for
// those who do not see the sheet.

import {KEYS, figure} from './words.js';

const byId = id => document.getElementById(id);

export class Foot {
  constructor() {
    this.known = [];
    this.since = [];
    this.said = '';
    this.own = '';
    this.hostNotice = '';
    const list = document.createElement('dl');
    for (const [key, meaning] of KEYS) {
      const term = document.createElement('dt'), words = document.createElement('dd'), name = document.createElement('kbd');
      name.textContent = key;
      term.append(name);
      words.textContent = meaning;
      list.append(term, words);
    }
    byId('keys').prepend(list);
  }

  show(picture) {
    this.picture = picture;
    const {output} = picture, state = byId('state');
    state.textContent = output.state;
    state.classList.toggle('alarm', output.alarm);
    if (picture.notice !== this.hostNotice) {
      this.hostNotice = picture.notice;
      this.own = '';
    }
    const alarm = this.alarm(picture);
    const notice = byId('notice');
    notice.textContent = this.own || alarm || picture.notice;
    notice.classList.toggle('alarm', Boolean(alarm) && !this.own);
    this.announce([picture.notice, output.alarm ? output.state : '', alarm].filter(Boolean).join(' '));
  }

  alarm(picture) {
    let text = '';
    picture.lanes.forEach((lane, k) => {
      const more = lane.saturated - (this.known[k] || 0);
      if (more <= 0) {
        this.since[k] = null;
        return;
      }
      this.since[k] ||= new Date().toTimeString().slice(0, 8);
      text ||= `Lane ${k + 1}: ${figure(more, 0)} samples saturated since ${this.since[k]}. Key a: seen.`;
    });
    return text;
  }

  seen() {
    this.known = this.picture.lanes.map(lane => lane.saturated);
    this.since = [];
    this.own = '';
    this.show(this.picture);
  }

  say(text) {
    this.own = text;
    if (this.picture) this.show(this.picture);
    this.announce(text);
  }

  announce(text) {
    const plain = text.replace(/\d+ samples/, 'samples');
    if (plain === this.said) return;
    this.said = plain;
    byId('announced').textContent = text;
  }
}
