// The figures and rulers, drawn on canvases in the inks of the sheet. Colour means a role, never a lane.

import {blocks, change, scale, spectrum} from './plots.js';
import {MINUS, figure, level} from './words.js';

const byId = id => document.getElementById(id);
const INKS = ['paper', 'sheet', 'grid', 'rule', 'ink', 'quiet', 'heard', 'before'];

function sized(name) {
  const canvas = byId(name), ratio = window.devicePixelRatio || 1, {clientWidth: wide, clientHeight: high} = canvas;
  if (canvas.width !== Math.round(wide * ratio) || canvas.height !== Math.round(high * ratio)) {
    canvas.width = Math.round(wide * ratio);
    canvas.height = Math.round(high * ratio);
  }
  const pen = canvas.getContext('2d');
  pen.setTransform(ratio, 0, 0, ratio, 0, 0);
  pen.clearRect(0, 0, wide, high);
  pen.font = `13px ${getComputedStyle(document.body).fontFamily}`;
  return {pen, wide, high};
}

function caption(number, text) {
  const place = byId(`caption-${number}`);
  if (place.dataset.text === text) return;
  place.dataset.text = text;
  const head = document.createElement('strong');
  head.textContent = `${number} `;
  place.replaceChildren(head, text);
}

export class Figures {
  constructor() {
    this.inks = {};
    this.frozen = false;
    this.last = null;
  }

  dress() {
    const style = getComputedStyle(document.documentElement);
    for (const name of INKS) this.inks[name] = style.getPropertyValue(`--${name}`).trim();
    this.drawn = null;
  }

  freeze() {
    this.frozen = !this.frozen;
    return this.frozen;
  }

  whole(number) {
    const place = byId('figures');
    place.classList.toggle('whole', number > 0);
    [1, 2, 3].forEach(k => byId(`figure-${k}`).classList.toggle('shown', k === number));
    this.drawn = null;
    if (this.last) this.plot(this.last);
  }

  // Thirty times a second: the level that goes out, and the spectrum.
  show(picture) {
    scale(sized('level'), this.inks, picture.level, picture.output);
    if (picture.change) this.change = picture.change;
    if (picture.diagram) this.diagram(picture.diagram);
    if (!this.frozen) {
      this.last = {...picture, change: this.change};
      this.plot(this.last);
    }
  }

  plot(picture) {
    if (picture.curves.heard) spectrum(sized('spectrum'), this.inks, picture.curves, picture.sentence.heard);
    if (this.change && this.drawn !== this.change) {
      this.drawn = this.change;
      change(sized('change'), this.inks, this.change);
    }
  }

  // Four times a second: block times and captions.
  showSlow(picture) {
    blocks(sized('blocks'), this.inks, picture.blocks);
    byId('blocks').setAttribute('aria-label',
      `99.9 % of blocks within ${figure(picture.blocks.nearly)} %, the worst ${figure(picture.blocks.worst)} % of the deadline`);
    if (this.frozen) return;
    const {heard} = picture.sentence, lane = picture.lanes[heard - 1], {points, mean} = picture.curves;
    let text = `Output of lane ${heard}`;
    if (picture.curves.difference) {
      text += ` and its difference from exact arithmetic: ${level(lane.noise)} dBFS`;
      if (typeof lane.predicted === 'number' && lane.noise !== null) {
        const over = lane.noise - lane.predicted;
        text += `, ${figure(Math.abs(over))} dB ${over < 0 ? 'below' : 'above'} the prediction`;
      }
    }
    caption(1, points ? `${text}. ${points.toLocaleString('en')} points, Hann, mean of ${mean}.` : 'No spectrum is kept.');
    caption(2, this.change ? this.told(this.change) : 'The last change: none yet. Keys 1 to 9 change the lane.');
  }

  told(made) {
    const apart = made.apart === null || made.apart < -200 ? 'no difference' : `${figure(made.apart)} dBFS apart at most`;
    const clipped = made.clipped ? ` ${made.clipped} states did not fit.` : '';
    return `Last change, ${made.before} to ${made.after}, ${made.changeover}: peak ${String(made.peak).replace('-', MINUS)} % of full `
      + `scale, ${apart} in 12 ms.${clipped}`;
  }

  diagram({lane, svg, caption: text}) {
    const drawing = new DOMParser().parseFromString(svg, 'image/svg+xml').documentElement;
    drawing.removeAttribute('width');
    drawing.removeAttribute('height');
    byId('diagram').replaceChildren(document.importNode(drawing, true));
    caption(3, `Lane ${lane}, ${text}`);
  }
}
