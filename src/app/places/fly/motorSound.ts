/**
 * The rotors as a sound: one voice each at its blade-pass frequency, louder with speed, and roughened by what
 * gyro noise does to the commands. Off until the person asks for it.
 */
export class MotorSound {
  private readonly context = new AudioContext();
  private readonly out: GainNode;
  private readonly voices: {
    readonly tone: OscillatorNode;
    readonly level: GainNode;
    readonly rough: GainNode;
  }[];

  constructor(private readonly blades: number) {
    this.out = this.context.createGain();
    this.out.gain.value = 0.12;
    this.out.connect(this.context.destination);
    const hiss = this.hiss();
    this.voices = [0, 1, 2, 3].map((i) => {
      const tone = this.context.createOscillator();
      const level = this.context.createGain();
      const rough = this.context.createGain();
      tone.type = 'sawtooth';
      // A little apart, as four motors are.
      tone.detune.value = [-7, 4, -3, 8][i];
      level.gain.value = 0;
      rough.gain.value = 0;
      hiss.connect(rough).connect(tone.detune);
      tone.connect(level).connect(this.out);
      tone.start();
      return { tone, level, rough };
    });
  }

  /** Rotor speeds rad/s, top speed rad/s, command noise µs rms. */
  update(speeds: ArrayLike<number>, top_radps: number, noise_us: number): void {
    const now = this.context.currentTime;
    this.voices.forEach(({ tone, level, rough }, i) => {
      const speed = Math.max(0, speeds[i]);
      const share = Math.min(1, speed / top_radps);
      tone.frequency.setTargetAtTime(Math.max(20, (speed * this.blades) / (2 * Math.PI)), now, 0.02);
      level.gain.setTargetAtTime(0.25 * share * share, now, 0.03);
      rough.gain.setTargetAtTime(Math.min(900, 12 * noise_us), now, 0.05);
    });
  }

  end(): void {
    void this.context.close();
  }

  /** Two seconds of noise, looped. */
  private hiss(): AudioBufferSourceNode {
    const length = 2 * this.context.sampleRate;
    const buffer = this.context.createBuffer(1, length, this.context.sampleRate);
    const samples = buffer.getChannelData(0);
    for (let i = 0; i < length; i++) samples[i] = 2 * Math.random() - 1;
    const source = this.context.createBufferSource();
    source.buffer = buffer;
    source.loop = true;
    source.start();
    return source;
  }
}
