// One plot each: axes from the data's units to pixels, hairlines, direct labels, no legends.

import {MINUS} from './words.js';

const LEFT = 44, RIGHT = 92, TOP = 8, BOTTOM = 22, APART = 16;
const LOWEST_DB = -160, DASH = [10, 4];

function text(pen, ink, words, x, y, align = 'left') {
  pen.fillStyle = ink;
  pen.textAlign = align;
  pen.textBaseline = 'middle';
  pen.fillText(words, x, y);
}

function line(pen, ink, wide, points, dash = []) {
  pen.strokeStyle = ink;
  pen.lineWidth = wide;
  pen.lineJoin = 'round';
  pen.setLineDash(dash);
  pen.beginPath();
  points.forEach(([x, y], k) => (k ? pen.lineTo(x, y) : pen.moveTo(x, y)));
  pen.stroke();
  pen.setLineDash([]);
}

function hatched(pen, ink, x, y, wide, high) {
  pen.save();
  pen.beginPath();
  pen.rect(x, y, wide, high);
  pen.clip();
  for (let k = -high; k < wide + high; k += 5) line(pen, ink, 1, [[x + k, y + high], [x + k + high, y]]);
  pen.restore();
  pen.strokeStyle = ink;
  pen.lineWidth = 1;
  pen.strokeRect(x + 0.5, y + 0.5, wide - 1, high - 1);
}

function lozenge(pen, inks, x, y) {
  pen.fillStyle = inks.sheet;
  pen.strokeStyle = inks.ink;
  pen.lineWidth = 1;
  pen.beginPath();
  pen.moveTo(x - 5, y);
  pen.lineTo(x, y - 5);
  pen.lineTo(x + 5, y);
  pen.lineTo(x, y + 5);
  pen.closePath();
  pen.fill();
  pen.stroke();
}

function signed(value) {
  return String(value).replace('-', MINUS);
}

// Labels at least 16 px apart, in the order in which they stand.
function endLabels(pen, labels, x, lowest) {
  labels.sort((a, b) => a.y - b.y);
  labels.forEach((label, k) => { if (k) label.y = Math.max(label.y, labels[k - 1].y + APART); });
  for (let k = labels.length - 1, most = lowest; k >= 0; k -= 1, most -= APART) labels[k].y = Math.min(labels[k].y, most);
  for (const {ink, words, y} of labels) text(pen, ink, words, x, y);
}

export function spectrum({pen, wide, high}, inks, curves, heard) {
  const right = wide - RIGHT, bottom = high - BOTTOM;
  const x = hertz => LEFT + (right - LEFT) * Math.log(hertz / 20) / Math.log(1000);
  const y = decibels => TOP + (bottom - TOP) * Math.min(decibels, 0) / LOWEST_DB;
  for (let level = 0; level >= LOWEST_DB; level -= 40) {
    line(pen, inks.grid, 1, [[LEFT, y(level)], [right, y(level)]]);
    text(pen, inks.quiet, signed(level), LEFT - 6, y(level), 'right');
  }
  for (const [hertz, words] of [[20, '20'], [100, '100'], [1000, '1 k'], [10000, ''], [20000, '20 kHz']]) {
    line(pen, inks.grid, 1, [[x(hertz), TOP], [x(hertz), bottom]]);
    text(pen, inks.quiet, words, x(hertz), bottom + 12, 'center');
  }
  const labels = [];
  const bin = curves.rate / curves.points;
  pen.save();
  pen.beginPath();
  pen.rect(LEFT, TOP - 2, right - LEFT, bottom - TOP + 4);
  pen.clip();
  const draw = (values, ink, broad, words) => {
    const shown = [];
    for (let k = 1; k < values.length; k += 1) {
      if (k * bin > 20000 * 1.01) break;
      shown.push([x(k * bin), y(values[k] / 10)]);
    }
    line(pen, ink, broad, shown);
    if (shown.length) labels.push({ink, words, y: shown.at(-1)[1]});
  };
  if (curves.difference) draw(curves.difference, inks.ink, 1.25, 'difference');
  draw(curves.heard, inks.heard, 2.25, `${heard} heard`);
  pen.restore();
  for (const [hertz, level] of curves.predicted) if (level > LOWEST_DB) lozenge(pen, inks, x(hertz), y(level));
  const last = curves.predicted.at(-1);
  if (last) labels.push({ink: inks.ink, words: '\u25c7 predicted', y: y(last[1])});
  endLabels(pen, labels, right + 8, bottom);
}

function round(value) {
  const step = 10 ** Math.floor(Math.log10(value));
  return [1, 2, 4, 5, 10].map(each => each * step).find(each => each >= value * 0.999);
}

export function change({pen, wide, high}, inks, made) {
  const right = wide - 12, bottom = high - BOTTOM, middle = (TOP + bottom) / 2;
  const largest = made.heard.concat(made.former).reduce((most, value) => Math.max(most, Math.abs(value)), 1e-3);
  const top = round(largest);
  const ms = k => (made.first + k) / made.rate * 1000;
  const x = time => LEFT + (right - LEFT) * (time + 5) / 17;
  const y = value => middle - (middle - TOP) * value / top;
  for (const value of [top, 0, -top]) {
    line(pen, inks.grid, 1, [[LEFT, y(value)], [right, y(value)]]);
    text(pen, inks.quiet, value > 0 ? `+${Number(value.toPrecision(1))}` : signed(Number(value.toPrecision(1))), LEFT - 4, y(value), 'right');
  }
  text(pen, inks.quiet, `${MINUS}5`, x(-5), bottom + 12, 'center');
  text(pen, inks.quiet, '0', x(0), bottom + 12, 'center');
  text(pen, inks.quiet, '12 ms', right, bottom + 12, 'right');
  line(pen, inks.ink, 1, [[x(0), TOP], [x(0), bottom]]);
  line(pen, inks.before, 2, made.former.map((value, k) => [x(ms(k)), y(value)]), DASH);
  line(pen, inks.heard, 2.25, made.heard.map((value, k) => [x(ms(k)), y(value)]));
  text(pen, inks.heard, `${made.after} ${made.changeover}`, right, TOP + 10, 'right');
  text(pen, inks.before, `${made.before} before`, right, bottom - 10, 'right');
}

export function scale({pen, wide}, inks, level, output) {
  const x = decibels => (wide - 8) * (Math.min(Math.max(decibels, -60), 0) + 60) / 60, base = 20;
  pen.fillStyle = inks.ink;
  if (level.rms !== null) pen.fillRect(0, base - 12, x(level.rms), 10);
  line(pen, inks.ink, 1, [[0, base + 0.5], [wide, base + 0.5]]);
  if (level.peak !== null) line(pen, inks.ink, 2, [[x(level.peak), base - 16], [x(level.peak), base]]);
  hatched(pen, inks.ink, x(output.ceiling), base - 16, 7, 16);
  text(pen, inks.quiet, `${MINUS}60`, 0, base + 12);
  text(pen, inks.quiet, `${MINUS}30`, x(-30), base + 12, 'center');
  text(pen, inks.quiet, `${signed(output.ceiling)} ceiling`, Math.min(x(output.ceiling), wide), base + 12, 'right');
}

// A logarithmic ruler from 0.1 to 100 % of the deadline; the comb's teeth are logarithms of counts.
export function blocks({pen, wide}, inks, times) {
  const right = wide - 148, left = 8, base = 26;
  const x = percent => left + (right - left) * Math.log10(Math.min(Math.max(percent, 0.1), 100) / 0.1) / 3;
  const most = times.comb.reduce((all, [, count]) => Math.max(all, count), 1);
  pen.fillStyle = inks.heard;
  for (const [percent, count] of times.comb) {
    const tall = 2 + 16 * Math.log(1 + count) / Math.log(1 + most);
    pen.fillRect(x(percent) - 2, base - tall, 2.5, tall);
  }
  line(pen, inks.ink, 1.25, [[left, base], [right, base]]);
  for (const decade of [0.1, 1, 10]) {
    for (let k = 1; k < 10; k += 1) line(pen, inks.ink, 1, [[x(decade * k), base], [x(decade * k), base + (k === 1 ? 12 : 5)]]);
    text(pen, inks.quiet, String(decade), x(decade) + 5, base + 9);
  }
  const marks = [[times.nearly, '99.9 % of blocks'], [times.worst, `worst ${signed(times.worst)} %`]];
  let taken = right - 4;
  for (const [percent, words] of times.blocks ? marks.reverse() : []) {
    const long = pen.measureText(words).width, at = x(percent);
    line(pen, inks.ink, 1, [[at, base - 16], [at, base]]);
    const from = at + 5 + long <= taken ? at + 5 : Math.min(at - 5, taken) - long;
    text(pen, inks.ink, words, from, base - 12);
    taken = Math.min(from, at) - 8;
  }
  hatched(pen, inks.ink, right, base - 20, 8, 32);
  text(pen, inks.ink, times.worst > 100 ? '100 %: missed' : '100 % deadline', right + 14, base);
}
