// runner: the first line must be
int main() { return missing; }
