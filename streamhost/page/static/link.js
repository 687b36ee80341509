// The one connection. The page asks for each picture, so that a slow page is sent fewer, and never old ones.

const KEY = location.hash.slice(1);
const AGAIN_MS = 1000;

export class Link {
  constructor(onPicture, onContact) {
    this.onPicture = onPicture;
    this.onContact = onContact;
    this.open();
  }

  open() {
    const socket = new WebSocket(`ws://${location.host}/live`);
    socket.binaryType = 'arraybuffer';
    socket.onopen = () => {
      this.socket = socket;
      this.send({do: 'open', key: KEY});
      this.next();
    };
    socket.onmessage = event => {
      this.onContact(true);
      this.onPicture(JSON.parse(new TextDecoder().decode(event.data)));
    };
    socket.onclose = () => {
      this.socket = null;
      this.onContact(false);
      setTimeout(() => this.open(), AGAIN_MS);
    };
  }

  send(message) {
    if (this.socket) this.socket.send(JSON.stringify(message));
  }

  next() {
    this.send({do: 'next'});
  }
}
