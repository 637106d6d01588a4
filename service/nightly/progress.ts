/** How far the night is: a bar on a terminal, plain lines in a log, or nothing. */

export interface Progress {
  /** A curve of so many masses begins. */
  curve(name: string, masses: number): void;
  points(done: number): void;
  /** The curve is through. */
  curveDone(words: string): void;
  /** Nothing more comes; a bar that is left is taken away. */
  end(): void;
}

interface Terminal {
  readonly isTTY?: boolean;
  readonly columns?: number;
  write(text: string): unknown;
}

export function progressOn(stream: Terminal, curves: number, quiet: boolean): Progress {
  if (quiet) return { curve() {}, points() {}, curveDone() {}, end() {} };
  return stream.isTTY ? bar(stream, curves) : plainLines(stream, curves);
}

function plainLines(stream: Terminal, curves: number): Progress {
  let [number, name, total, quarters] = [0, '', 0, 0];
  const line = (words: string): void => void stream.write(`${number}/${curves} ${name}: ${words}\n`);
  return {
    curve(newName, masses) {
      [number, name, total, quarters] = [number + 1, newName, masses, 0];
      line(`${masses} masses`);
    },
    points(done) {
      const now = Math.floor((4 * done) / total);
      if (now > quarters && now < 4) line(`${done} of ${total} masses`);
      quarters = now;
    },
    curveDone: line,
    end() {},
  };
}

const BAR = 24;

function bar(stream: Terminal, curves: number): Progress {
  let [number, name, total] = [0, '', 0];
  const clear = (): void => void stream.write('\r\u001b[2K');
  const draw = (done: number): void => {
    const full = Math.round((BAR * done) / total);
    const text = `[${'█'.repeat(full)}${'·'.repeat(BAR - full)}] ${done}/${total}  ${number}/${curves} ${name}`;
    clear();
    // a line that wraps could not be taken back
    stream.write([...text].slice(0, Math.max(10, (stream.columns ?? 80) - 1)).join(''));
  };
  return {
    curve(newName, masses) {
      [number, name, total] = [number + 1, newName, masses];
      draw(0);
    },
    points: draw,
    curveDone(words) {
      clear();
      stream.write(`${number}/${curves} ${name}: ${words}\n`);
    },
    end: clear,
  };
}
