; Inno Setup 6: wraps the folder that packaging/build.py makes on Windows.
; iscc packaging\windows\spinledger.iss
#define Root "..\.."

[Setup]
AppName=Spin Ledger
AppVersion=0.1.0
AppId=org.spinledger.bench
DefaultDirName={autopf}\Spin Ledger
DefaultGroupName=Spin Ledger
PrivilegesRequiredOverridesAllowed=dialog
OutputDir={#Root}\dist
OutputBaseFilename=spinledger-setup
LicenseFile={#Root}\LICENSE
ChangesAssociations=yes
ArchitecturesAllowed=x64compatible
ArchitecturesInstallIn64BitMode=x64compatible

[Files]
Source: "{#Root}\build\package\spinledger\*"; DestDir: "{app}"; Flags: recursesubdirs
Source: "{#Root}\build\package\THIRD-PARTY\*"; DestDir: "{app}\THIRD-PARTY"; Flags: recursesubdirs

[Icons]
Name: "{group}\Spin Ledger"; Filename: "{app}\spinledger-bench.exe"

[Registry]
Root: HKA; Subkey: "Software\Classes\.sledger"; ValueType: string; ValueData: "SpinLedger.Project"; Flags: uninsdeletevalue
Root: HKA; Subkey: "Software\Classes\SpinLedger.Project"; ValueType: string; ValueData: "Spin Ledger project"; Flags: uninsdeletekey
Root: HKA; Subkey: "Software\Classes\SpinLedger.Project\shell\open\command"; ValueType: string; ValueData: """{app}\spinledger-bench.exe"" ""%1"""
