// The sentence: its bold words are buttons, their keys beside them; each opens a list of words under itself.

import {CHANGEOVERS, SOURCES, differenceWord, short} from './words.js';

export class Sentence {
  constructor(send) {
    this.send = send;
    this.words = {};
    for (const place of document.querySelectorAll('.word')) {
      const button = document.createElement('button');
      button.type = 'button';
      button.setAttribute('aria-haspopup', 'true');
      place.append(button);
      button.addEventListener('click', () => this.toggle(place.dataset.word));
      this.words[place.dataset.word] = {place, button};
    }
    document.addEventListener('click', event => {
      if (!event.target.closest('.word')) this.close();
    });
  }

  show(sentence) {
    this.sentence = sentence;
    this.write('lane', String(sentence.heard), sentence.count > 1 ? `1\u2013${sentence.count}` : '1');
    this.write('source', sentence.source, 's');
    this.write('monitor', `${short(sentence.monitor)} dB`, '+ \u2212');
    this.write('changeover', sentence.changeover, 'h');
    this.write('difference', differenceWord(sentence), 'd');
    this.write('recording', 'not recording', 'r');
    document.getElementById('place').textContent = `, on ${sentence.place}`;
  }

  write(name, text, key) {
    const {button} = this.words[name];
    const whole = `${text}|${key}`;
    if (button.dataset.whole === whole) return;
    button.dataset.whole = whole;
    const beside = document.createElement('kbd');
    beside.textContent = key;
    button.replaceChildren(text, beside);
  }

  choices(name) {
    const now = this.sentence;
    const lanes = Array.from({length: now.count}, (_, k) => [`lane ${k + 1}`, {do: 'hear', lane: k + 1}, k + 1 === now.heard]);
    return {
      lane: [...lanes, ['the lane before', {do: 'back'}, false]],
      source: SOURCES.map(what => [what, {do: 'source', what}, what === now.source]),
      monitor: [['1 dB up', {do: 'monitor', steps: 1}], ['1 dB down', {do: 'monitor', steps: -1}],
        ['come up', {do: 'rise'}], ['mute', {do: 'mute'}]],
      changeover: CHANGEOVERS.map(by => [by, {do: 'changeover', by}, by === now.changeover]),
      difference: [[now.differs ? 'hear the lane itself' : 'hear the difference', {do: 'difference'}],
        [now.against === 'ideal' ? 'against the lane before' : 'against exact', {do: 'reference'}],
        ['6 dB more', {do: 'raise', steps: 1}], ['6 dB less', {do: 'raise', steps: -1}]],
      recording: [['start listen with --record FILE', null]],
    }[name];
  }

  toggle(name) {
    const {place, button} = this.words[name];
    const shut = !place.querySelector('ul');
    this.close();
    if (!shut) return;
    const list = document.createElement('ul');
    for (const [text, message, current] of this.choices(name)) {
      const item = document.createElement('li'), choice = document.createElement('button');
      choice.type = 'button';
      choice.textContent = text;
      choice.setAttribute('aria-current', String(Boolean(current)));
      choice.addEventListener('click', () => {
        if (message) this.send(message);
        this.close();
        button.focus();
      });
      item.append(choice);
      list.append(item);
    }
    place.append(list);
    button.setAttribute('aria-expanded', 'true');
    list.querySelector('button').focus();
  }

  close() {
    for (const {place, button} of Object.values(this.words)) {
      place.querySelector('ul')?.remove();
      button.setAttribute('aria-expanded', 'false');
    }
  }
}
