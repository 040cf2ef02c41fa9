/* The equations of src/physics/{dynamics,rotor}.ts in C, for the speed ratio of `npm run bench` only.
 * Reads constants as numbers on standard input (see flight.bench.ts for the order), runs N RK4 steps from
 * hover, resetting every 2000, and prints seconds and a check sum of the state. */
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <time.h>

#define NS 22
#define TP 257
enum { POS = 0, VEL = 3, ATT = 6, RATE = 10, ROT = 13, INF = 17, CHG = 21 };

static double mass, I[9], Inv[9], area[3], pos[12], spin[4];
static double radius, perTwiceArea, tablePerSpeed, slope, inPlane, relax, Jr;
static double kTt[TP], kQt[TP], kHt[TP];
static double Kt, Rm, I0, Rb, capacity, openV, rho, groundDown, share[4] = {1, 1, 1, 1};
static double duty[4], wind[3], gust[3];
static double heldT[4], heldQ[4], heldH[4], heldS[4];
static double loads[4][7], current[4], volts, amps, acc[3], ang[3], spec[3];

static double ratio(double x) {
  if (x >= 0) return -x / 2 + sqrt(x * x / 4 + 1);
  if (x >= -2) return 1 + x * (-1.125 + x * (-1.372 + x * (-1.718 + x * -0.655)));
  return -x / 2 - sqrt(x * x / 4 - 1);
}
static double groundEffect(double R, double h) {
  if (h > 8 * R) return 1;
  double c = h / R > 0.5 ? h / R : 0.5, q = 1 / (4 * c);
  return 1 / (1 - q * q);
}
static void prepare(const double *s) {
  for (int i = 0; i < 4; i++) {
    double place = fmin(fabs(s[ROT + i]) * tablePerSpeed, TP - 1.000001);
    int k = (int)place;
    double f = place - k;
    heldT[i] = share[i] * (kTt[k] + f * (kTt[k + 1] - kTt[k]));
    heldQ[i] = kQt[k] + f * (kQt[k + 1] - kQt[k]);
    heldH[i] = sqrt(share[i]) * (kHt[k] + f * (kHt[k + 1] - kHt[k]));
    heldS[i] = share[i];
  }
}
static void battery(const double *s) {
  double emf[4], sq = 0, back = 0, per = 1 / Rm, total = 0;
  for (int i = 0; i < 4; i++) {
    emf[i] = Kt * s[ROT + i];
    sq += duty[i] * duty[i];
    back += duty[i] * emf[i];
  }
  volts = (openV + Rb * back * per) / (1 + Rb * sq * per);
  for (int i = 0; i < 4; i++) {
    current[i] = (duty[i] * volts - emf[i]) * per;
    total += duty[i] * current[i];
  }
  amps = total;
}
static void rotor(int i, double speed, double inflow, double u, double v, double w, double ground, double *o) {
  double climb = -w, hover = heldH[i] * speed, through = climb + inflow;
  double per = rho * (heldT[i] * speed - slope * heldS[i] * (through - hover));
  double torque = per * through + rho * (heldQ[i] - heldT[i] * heldH[i]) * speed * speed;
  double thrust = per * speed, square = thrust * perTwiceArea / rho, axial = climb + inflow;
  if (climb < 0 && square > 1e-6 && climb * climb < 4 * square) {
    double vh = sqrt(square);
    axial = vh / ratio(climb / vh);
  }
  double flow = sqrt(u * u + v * v + axial * axial), drag = inPlane * rho / 1.225 * fabs(speed);
  double edge = speed > 1 ? per + 0.5 * rho * slope * through : 0, roll = 0.95 * edge * spin[i], b = 0.24 * edge;
  o[0] = thrust * ground;
  o[1] = torque;
  o[2] = -drag * u;
  o[3] = -drag * v;
  o[4] = roll * u - b * v;
  o[5] = roll * v + b * u;
  o[6] = (square - flow * inflow) * relax;
}
static void derivative(const double *s, double *d) {
  double qw = s[6], qx = s[7], qy = s[8], qz = s[9];
  double n = 2 / (qw * qw + qx * qx + qy * qy + qz * qz);
  double r00 = 1 - n * (qy * qy + qz * qz), r01 = n * (qx * qy - qw * qz), r02 = n * (qx * qz + qw * qy);
  double r10 = n * (qx * qy + qw * qz), r11 = 1 - n * (qx * qx + qz * qz), r12 = n * (qy * qz - qw * qx);
  double r20 = n * (qx * qz - qw * qy), r21 = n * (qy * qz + qw * qx), r22 = 1 - n * (qx * qx + qy * qy);
  double p = s[10], q = s[11], r = s[12];
  double an = s[3] - wind[0], ae = s[4] - wind[1], ad = s[5] - wind[2];
  double u = r00 * an + r10 * ae + r20 * ad, v = r01 * an + r11 * ae + r21 * ad, w = r02 * an + r12 * ae + r22 * ad;
  double pa = p - gust[0], qa = q - gust[1], ra = r - gust[2];
  battery(s);
  d[CHG] = -amps / capacity;
  double fx = 0, fy = 0, fz = 0, mx = 0, my = 0, mz = 0, h = 0;
  for (int i = 0; i < 4; i++) {
    double x = pos[3 * i], y = pos[3 * i + 1], z = pos[3 * i + 2], *o = loads[i];
    double height = groundDown - (s[2] + r20 * x + r21 * y + r22 * z);
    rotor(i, s[ROT + i], s[INF + i], u + qa * z - ra * y, v + ra * x - pa * z, w + pa * y - qa * x,
          r22 > 0.5 ? groundEffect(radius, height) : 1, o);
    double friction = I0 * fmax(-1, fmin(1, s[ROT + i] / 5));
    double up = (Kt * (current[i] - friction) - o[1]) / Jr;
    d[ROT + i] = up;
    d[INF + i] = o[6];
    h += spin[i] * Jr * s[ROT + i];
    fx += o[2];
    fy += o[3];
    fz -= o[0];
    mx += y * -o[0] - z * o[3] + o[4];
    my += z * o[2] + x * o[0] + o[5];
    mz += x * o[3] - y * o[2] - spin[i] * (Jr * up + o[1]);
  }
  fx -= 0.5 * rho * area[0] * fabs(u) * u;
  fy -= 0.5 * rho * area[1] * fabs(v) * v;
  fz -= 0.5 * rho * area[2] * fabs(w) * w;
  double sx = fx / mass, sy = fy / mass, sz = fz / mass;
  d[0] = s[3]; d[1] = s[4]; d[2] = s[5];
  d[3] = r00 * sx + r01 * sy + r02 * sz;
  d[4] = r10 * sx + r11 * sy + r12 * sz;
  d[5] = r20 * sx + r21 * sy + r22 * sz + 9.80665;
  double hx = I[0] * p + I[1] * q + I[2] * r, hy = I[3] * p + I[4] * q + I[5] * r;
  double hz = I[6] * p + I[7] * q + I[8] * r + h;
  double tx = mx - (q * hz - r * hy), ty = my - (r * hx - p * hz), tz = mz - (p * hy - q * hx);
  d[10] = Inv[0] * tx + Inv[1] * ty + Inv[2] * tz;
  d[11] = Inv[3] * tx + Inv[4] * ty + Inv[5] * tz;
  d[12] = Inv[6] * tx + Inv[7] * ty + Inv[8] * tz;
  d[6] = 0.5 * (-qx * p - qy * q - qz * r);
  d[7] = 0.5 * (qw * p + qy * r - qz * q);
  d[8] = 0.5 * (qw * q + qz * p - qx * r);
  d[9] = 0.5 * (qw * r + qx * q - qy * p);
  spec[0] = sx; spec[1] = sy; spec[2] = sz;
  for (int i = 0; i < 3; i++) acc[i] = d[3 + i], ang[i] = d[10 + i];
}
static void step(double *s, double h) {
  static double k1[NS], k2[NS], k3[NS], k4[NS], t[NS];
  derivative(s, k1);
  for (int i = 0; i < NS; i++) t[i] = s[i] + h / 2 * k1[i];
  derivative(t, k2);
  for (int i = 0; i < NS; i++) t[i] = s[i] + h / 2 * k2[i];
  derivative(t, k3);
  for (int i = 0; i < NS; i++) t[i] = s[i] + h * k3[i];
  derivative(t, k4);
  for (int i = 0; i < NS; i++) s[i] += h / 6 * (k1[i] + 2 * (k2[i] + k3[i]) + k4[i]);
}
static void take(double *a, int n) {
  for (int i = 0; i < n; i++) if (scanf("%lf", a + i) != 1) a[i] = NAN;
}
int main(void) {
  double steps, h, start[NS], s[NS];
  take(&steps, 1); take(&h, 1);
  take(&mass, 1); take(I, 9); take(Inv, 9); take(area, 3); take(pos, 12); take(spin, 4);
  take(&radius, 1); take(&perTwiceArea, 1); take(&tablePerSpeed, 1); take(&slope, 1); take(&inPlane, 1);
  take(&relax, 1); take(&Jr, 1); take(kTt, TP); take(kQt, TP); take(kHt, TP);
  take(&Kt, 1); take(&Rm, 1); take(&I0, 1); take(&Rb, 1); take(&capacity, 1); take(&openV, 1);
  take(&rho, 1); take(&groundDown, 1); take(duty, 4); take(start, NS);
  double sum = 0;
  clock_t t0 = clock();
  for (long k = 0; k < (long)steps; k++) {
    if (k % 2000 == 0) { if (k) sum = sum * 0.5 + s[RATE] + s[POS + 2]; memcpy(s, start, sizeof s); s[RATE] = 0.1; }
    prepare(s);
    step(s, h);
  }
  printf("%.6f %.17g\n", (double)(clock() - t0) / CLOCKS_PER_SEC, sum);
  return 0;
}
