// The ledger: a row for each lane, the one that is heard between two rules, the cursor a dashed frame.

import {figure} from './words.js';

const MANY = 6;

export class Ledger {
  constructor(hear) {
    this.body = document.getElementById('lanes');
    this.cursor = 0;
    this.rows = [];
    this.hear = hear;
  }

  show(lanes, heard, silent) {
    while (this.rows.length < lanes.length) this.rows.push(this.add(this.rows.length));
    this.body.className = (lanes.length >= MANY ? 'many ' : '') + (silent ? 'silent' : '');
    lanes.forEach((lane, k) => {
      const texts = [String(k + 1), lane.title, lane.about, figure(lane.peak), figure(lane.noise), figure(lane.predicted),
        String(lane.saturated), figure(lane.load, 2), lane.state];
      texts.forEach((text, column) => {
        const cell = this.rows[k].cells[column];
        if (cell.textContent === text) return;
        cell.textContent = text;
        if (column === 1 || column === 2) cell.title = text;
      });
    });
    if (this.heard !== heard) {
      this.heard = heard;
      this.rows[heard - 1].scrollIntoView({block: 'nearest'});
    }
    this.mark();
  }

  move(steps) {
    this.cursor = Math.min(Math.max(this.cursor + steps, 0), this.rows.length - 1);
    this.rows[this.cursor].scrollIntoView({block: 'nearest'});
    this.pointed = true;
    this.mark();
  }

  mark() {
    this.rows.forEach((row, k) => {
      row.classList.toggle('heard', k === this.heard - 1);
      row.classList.toggle('cursor', Boolean(this.pointed) && k === this.cursor);
      row.setAttribute('aria-current', k === this.heard - 1 ? 'true' : 'false');
    });
  }

  add(k) {
    const row = this.body.insertRow();
    for (let column = 0; column < 9; column += 1) row.insertCell();
    row.addEventListener('dblclick', () => this.hear(k + 1));
    row.addEventListener('click', () => {
      this.cursor = k;
      this.move(0);
    });
    return row;
  }
}
