// expect: 'missing'
// runner: the message is
int f1() { return missing; }
int f2() { return missing; }
int f3() { return missing; }
int f4() { return missing; }
int f5() { return missing; }
int f6() { return missing; }
int f7() { return missing; }
int main() { return f1() + f2() + f3() + f4() + f5() + f6() + f7(); }
